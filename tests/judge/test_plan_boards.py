"""Values for a target and shares of passing boards, against textbook formulas and brute force."""

import math

import numpy as np
import pytest
from judged_boards import board, limit, part, single

from benchtool.errors import UsageError
from benchtool.judge.plan_boards import (
    N_BOARDS,
    draw_lot,
    foresee,
    tell_outside,
    value_for,
    with_known_parts,
)
from benchtool.model.design import Ic, Part
from benchtool.model.picking import Candidate, Spread
from benchtool.model.plan import PlannedQuantity
from benchtool.model.quantity import Measured

LN2, LN3 = math.log(2), math.log(3)
LIMITS = (23.0, 26.0)


def spread(value: float, half_rel: float) -> Spread:
    return Spread(value=value, lower=value * (1 - half_rel), upper=value * (1 + half_rel))


def period_limits(u: float) -> list[PlannedQuantity]:
    expected = Measured(value=24.76, u=u, unit="s")
    return [
        PlannedQuantity(
            quantity="period",
            nominal=24.76,
            unit="s",
            lower=LIMITS[0],
            upper=LIMITS[1],
            n=1,
            expected=expected,
            U=2 * u,
            w=2 * u,
            room=None,
            risks=None,
        )
    ]


def test_the_value_for_a_target_is_that_of_the_textbook() -> None:
    stage, design = board()
    discharging_ohm = value_for(stage, design, "RB", "period", 25.0)
    assert discharging_ohm == pytest.approx((25.0 / (47e-6 * LN2) - 100e3) / 2, rel=1e-11)
    timing_f = value_for(stage, design, "C", "t_high", 13.0)
    assert timing_f == pytest.approx(13.0 / (430e3 * LN2), rel=1e-11)
    charging_ohm = value_for(stage, design, "RA", "duty", 0.6)  # (RA+RB)/(RA+2RB) = 0.6
    assert charging_ohm == pytest.approx(330e3 * 0.2 / 0.4, rel=1e-11)


def test_the_value_for_a_pulse_is_that_of_the_textbook() -> None:
    stage, design = board(single(part("R", 68e3, 0.01), part("C", 47e-6)), topology="one-shot")
    assert value_for(stage, design, "R", "t_high", 4.0) == pytest.approx(4.0 / (47e-6 * LN3))


def test_a_real_ic_gives_its_target_when_the_value_is_put_in() -> None:
    from benchtool.judge.responses import respond_nominally

    stage, design = board(ic=Ic(family="bipolar"))
    RB = value_for(stage, design, "RB", "period", 25.0)
    changed = with_known_parts(stage, {"RB": spread(RB, 0.0)})
    assert respond_nominally(changed, design)["period"] == pytest.approx(25.0, rel=1e-11)


@pytest.mark.parametrize(
    ("ref", "quantity", "target", "said"),
    [
        ("RC", "period", 25.0, "no part 'RC'"),
        ("RB", "delay", 25.0, "no delay"),
        ("RB", "period", 1.0, "it reaches"),
        ("RB", "duty", 0.4, "it reaches"),
    ],
)
def test_what_cannot_be_is_refused_with_a_reason(
    ref: str, quantity: str, target: float, said: str
) -> None:
    with pytest.raises(UsageError, match=said):
        value_for(*board(), ref, quantity, target)


def test_a_measured_part_takes_the_place_of_the_marked_one_with_its_own_range() -> None:
    stage, _ = board()
    changed = with_known_parts(stage, {"C": spread(44e-6, 0.02)})
    assert changed.parts["C"].value == 44e-6
    assert (changed.parts["C"].lower_rel, changed.parts["C"].upper_rel) == pytest.approx(
        (-0.02, 0.02)
    )
    assert changed.parts["RA"] == stage.parts["RA"]
    with pytest.raises(UsageError, match="no part 'L'"):
        with_known_parts(stage, {"L": spread(1.0, 0.0)})


def brute_share(rb: np.ndarray, u: float, rng: np.random.Generator) -> float:
    """Return the share that passes, from the textbook period and errors drawn one by one."""
    ra = rng.uniform(99e3, 101e3, rb.size)
    c = rng.uniform(47e-6 * 0.9, 47e-6 * 1.1, rb.size)
    seen = (ra + 2 * rb) * c * LN2 + u * rng.standard_normal(rb.size)
    return float(np.mean((seen >= LIMITS[0] + 2 * u) & (seen <= LIMITS[1] - 2 * u)))


@pytest.mark.parametrize("u", [0.01, 0.25])
@pytest.mark.parametrize("action", ["keep", "replace", "parallel"])
def test_the_share_of_passing_boards_is_that_of_brute_force(action: str, u: float) -> None:
    """0.015: five standard errors of a share from 40,000 boards and one from 400,000."""
    stage, design = board()
    have, pad = spread(346e3, 0.02), spread(6.8e6, 0.05)
    rng = np.random.default_rng(21)
    there = rng.uniform(have.lower, have.upper, 400_000)
    added = rng.uniform(pad.lower, pad.upper, 400_000)
    new = spread(320e3, 0.05)
    made = {
        "keep": there,
        "replace": rng.uniform(new.lower, new.upper, 400_000),
        "parallel": there * added / (there + added),
    }
    fitted = {"keep": None, "replace": new, "parallel": pad}[action]
    result = spread(float(np.median(made[action])), 0.0)
    candidate = Candidate(
        action=action, added=fitted, series="E24", result=result, u=1.0, off_rel=0.0
    )
    joining = (lambda a, b: a * b / (a + b)) if action == "parallel" else None
    lot = draw_lot(stage, design, "RB")
    found = foresee(lot, have, candidate, joining, period_limits(u))
    assert found.p_pass == pytest.approx(brute_share(made[action], u, rng), abs=0.015)
    assert 0.05 < found.p_pass < 0.95  # a share at either end would test nothing
    nominal = (100e3 + 2 * result.value) * 47e-6 * LN2
    assert found.nominal["period"] == pytest.approx(nominal, rel=1e-9)


def test_the_same_boards_serve_every_candidate() -> None:
    lot = draw_lot(*board(), "RB")
    again = draw_lot(*board(), "RB")
    assert "RB" not in lot.point
    assert lot.place_there.shape == (N_BOARDS,)
    assert np.array_equal(lot.point["C"], again.point["C"])


def test_without_limits_there_is_no_share() -> None:
    stage, design = board()
    candidate = Candidate(
        action="keep", added=None, series=None, result=spread(330e3, 0), u=0.0, off_rel=0.0
    )
    lot = draw_lot(stage, design, "RB")
    assert foresee(lot, spread(330e3, 0.01), candidate, None, []).p_pass is None


def test_a_target_outside_the_limits_is_told() -> None:
    told = tell_outside("period", 5.0, period_limits(0.01))
    assert [notice.code for notice in told] == ["target-outside-limits"]
    assert tell_outside("period", 25.0, period_limits(0.01)) == ()
    assert tell_outside("t_high", 5.0, period_limits(0.01)) == ()


def test_a_part_without_a_range_can_be_the_open_one() -> None:
    """Its coordinate does not exist then, and its values are put in all the same."""
    parts = {"RA": part("RA", 100e3), "RB": Part(ref="RB", value=330e3), "C": part("C", 47e-6, 0.1)}
    stage, design = board(parts, limits=(limit("period", *LIMITS),))
    lot = draw_lot(stage, design, "RB")
    candidate = Candidate(
        action="replace",
        added=spread(320e3, 0.05),
        series="E24",
        result=spread(320e3, 0.05),
        u=1.0,
        off_rel=0.0,
    )
    assert 0.1 < foresee(lot, spread(330e3, 0.0), candidate, None, period_limits(0.1)).p_pass < 0.9
