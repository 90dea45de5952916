"""What could be fitted: against arithmetic by hand, the published series, and brute force."""

import csv
import itertools
import math
from pathlib import Path

import numpy as np
import pytest

from benchtool.model.design import Part
from benchtool.model.picking import Candidate, Offer, Outlook, Spread
from benchtool.parts.picking import (
    SERIES_TOLERANCES,
    join,
    list_candidates,
    order_offers,
    spread_of,
)
from benchtool.parts.picking_cautions import (
    HIDDEN_CAUSES,
    Seen,
    list_checks,
    moved_by,
    tell_causes,
)

TABLE = Path(__file__).parents[1] / "reference" / "iec60063_e_series.csv"
ONE = (-0.01, 0.01)


def published(series: str) -> list[float]:
    """Return every value of a series from 1 to 10 M as the standard prints it."""
    rows = csv.DictReader(
        line for line in TABLE.read_text("utf-8").splitlines() if not line.startswith("#")
    )
    mantissas = [float(row["value"]) for row in rows if row["series"] == series]
    return [float(f"{value}e{decade}") for decade in range(8) for value in mantissas]


def pick(have: Spread, wanted: float, kind: str = "resistor", series: str = "E24", **more: object):
    tolerances = {series: more.pop("tolerance", ONE)}
    return list_candidates(have, wanted, kind, series=[series], tolerances_rel=tolerances)


def of(candidates: tuple[Candidate, ...], action: str) -> list[Candidate]:
    return [item for item in candidates if item.action == action]


@pytest.mark.parametrize("series", ["E12", "E24", "E96"])
@pytest.mark.parametrize(("have", "wanted"), [(346e3, 330e3), (318e3, 330e3), (102.2e3, 100e3)])
def test_the_nearest_trim_and_replacement_are_those_of_a_full_search(
    series: str, have: float, wanted: float
) -> None:
    """Every published value is tried; the nearest on either side must be among the candidates."""
    found = pick(spread_of(have, *ONE), wanted, series=series)
    trims = of(found, "parallel") + of(found, "series")
    padded = [have * x / (have + x) for x in published(series)]
    trimmed = padded if have > wanted else [have + x for x in published(series)]
    for values, offered in ((trimmed, trims), (published(series), of(found, "replace"))):
        best = min(values, key=lambda value: abs(value / wanted - 1))
        nearest = min((item.result.value for item in offered), key=lambda x: abs(x / wanted - 1))
        assert nearest == pytest.approx(best, rel=1e-12)


def test_a_resistor_that_reads_high_gets_one_across_it_and_one_that_reads_low_one_in_series() -> (
    None
):
    high, low = pick(spread_of(346e3, *ONE), 330e3), pick(spread_of(318e3, *ONE), 330e3)
    assert of(high, "parallel")
    assert not of(high, "series")
    assert of(low, "series")
    assert not of(low, "parallel")


def test_a_capacitor_is_trimmed_the_other_way_round() -> None:
    low = pick(spread_of(44e-9, *ONE), 47e-9, "capacitor", "E12")
    added = {item.added.value: item.result.value for item in of(low, "parallel")}
    assert added == {2.7e-9: pytest.approx(46.7e-9), 3.3e-9: pytest.approx(47.3e-9)}
    high = pick(spread_of(50e-9, *ONE), 47e-9, "capacitor", "E12")
    assert {item.action for item in high} == {"keep", "replace", "series"}
    by_hand = 1 / (1 / 50e-9 + 1 / 820e-9)
    assert by_hand in [pytest.approx(item.result.value) for item in of(high, "series")]


def test_an_electrolytic_is_never_trimmed() -> None:
    found = pick(spread_of(44e-6, *ONE), 47e-6, "electrolytic", "E6")
    assert {item.action for item in found} == {"keep", "replace"}


def test_extremes_and_u_of_a_pad_are_those_of_brute_force() -> None:
    """2e5 random pairs; their standard deviation is known to 0.16 %, the rest is second order."""
    have = spread_of(346e3, -0.005, 0.005)
    pad = of(pick(have, 330e3, tolerance=(-0.05, 0.05)), "parallel")[0]
    rng = np.random.default_rng(5)
    pair = [rng.uniform(part.lower, part.upper, 200_000) for part in (have, pad.added)]
    value = pair[0] * pair[1] / (pair[0] + pair[1])
    assert pad.u == pytest.approx(value.std(), rel=0.01)
    corners = [
        a * b / (a + b)
        for a, b in itertools.product((have.lower, have.upper), (pad.added.lower, pad.added.upper))
    ]
    assert (pad.result.lower, pad.result.upper) == pytest.approx((min(corners), max(corners)))
    assert pad.result.lower <= value.min()
    assert value.max() <= pad.result.upper


def test_u_of_a_series_trim_is_the_root_sum_of_both() -> None:
    have = spread_of(318e3, -0.01, 0.01)
    trim = of(pick(have, 330e3), "series")[0]
    by_hand = math.hypot(3180, 0.01 * trim.added.value) / math.sqrt(3)
    assert trim.u == pytest.approx(by_hand)
    assert trim.result.half_width == pytest.approx(3180 + 0.01 * trim.added.value)


def test_the_order_weighs_distance_and_spread_together() -> None:
    """A loose part that is dead right comes after a pad that is a little off and far surer."""
    found = pick(spread_of(346e3, -0.001, 0.001), 330e3, tolerance=(-0.05, 0.05))
    assert found[0].action == "parallel"
    exact = next(item for item in found if item.off_rel == 0)
    assert found.index(exact) > 0
    away = [math.hypot(item.off_rel, item.u / 330e3) for item in found]
    assert away == sorted(away)


def test_what_is_right_already_is_left_alone_first() -> None:
    found = pick(spread_of(330e3, *ONE), 330e3)
    assert found[0].action == "keep"
    assert not of(found, "parallel") + of(found, "series")


@pytest.mark.parametrize(
    ("have", "wanted"), [(330.001e3, 330e3), (329999.8, 330e3), (990e3, 330e3)]
)
def test_no_trim_is_proposed_that_the_board_itself_would_spoil_or_that_is_none(
    have: float, wanted: float
) -> None:
    """It would take a pad of 100 GΩ, 0.2 Ω in series, or a resistor that sets the value itself."""
    assert not [
        item
        for item in pick(spread_of(have, *ONE), wanted)
        if item.action not in ("keep", "replace")
    ]


def test_each_value_is_offered_once_in_the_series_with_the_closer_tolerance() -> None:
    found = list_candidates(
        spread_of(346e3, *ONE),
        330e3,
        "resistor",
        series=["E12", "E24"],
        tolerances_rel={name: (-tol, tol) for name, tol in SERIES_TOLERANCES.items()},
    )
    replacements = [item for item in of(found, "replace") if item.added.value == 330e3]
    assert [item.series for item in replacements] == ["E24"]


def test_join_adds_and_joins_inverses() -> None:
    assert join(100.0, 50.0, adds=True) == 150.0
    assert join(100.0, 100.0, adds=False) == 50.0


def offer(action: str, p_pass: float) -> Offer:
    part = spread_of(330e3, *ONE)
    candidate = Candidate(action=action, added=part, series="E24", result=part, u=1.0, off_rel=0.0)
    return Offer(candidate=candidate, outlook=Outlook(nominal={}, p_pass=p_pass))


def test_shares_order_offers_where_they_differ_enough() -> None:
    near, better, alike = offer("parallel", 0.80), offer("replace", 0.99), offer("keep", 0.79)
    ordered = order_offers([near, better, alike], has_moved=False, by_share=True)
    assert ordered == (better, near, alike)
    assert order_offers([near, better], has_moved=False, by_share=False) == (near, better)


def test_a_part_that_has_moved_is_rather_replaced_than_trimmed() -> None:
    pad, new = offer("parallel", 0.99), offer("replace", 0.98)
    assert order_offers([pad, new], has_moved=True, by_share=True) == (new, pad)
    assert order_offers([pad, new], has_moved=False, by_share=True) == (pad, new)


def codes(
    seen: Seen | None, have: float = 346e3, tolerance: tuple[float, float] = ONE
) -> list[str]:
    notices = tell_causes("RB", spread_of(have, *ONE), 330e3, tolerance, seen)
    return [notice.code for notice in notices]


def test_a_change_beyond_the_tolerance_is_told_and_one_inside_is_not() -> None:
    assert "trim-beyond-tolerance" in codes(None)
    assert "trim-beyond-tolerance" not in codes(None, have=331e3)


def test_without_a_diagnosis_the_cause_comes_first_always() -> None:
    assert "find-the-cause-first" in codes(None, have=330e3)


@pytest.mark.parametrize("fault", HIDDEN_CAUSES)
def test_a_suspect_that_a_trim_would_hide_is_named_from_5_percent_on(fault: str) -> None:
    live, excluded = Seen(suspects={fault: 0.05}), Seen(suspects={fault: 0.049})
    assert "trim-would-hide-a-leak" in codes(live)
    assert codes(excluded, have=331e3) == []


def test_a_drift_that_was_seen_is_named() -> None:
    notices = list(
        tell_causes(
            "RB", spread_of(331e3, *ONE), 330e3, ONE, Seen(suspects={}, findings=("drifting",))
        )
    )
    assert [notice.code for notice in notices] == ["trim-would-hide-a-leak"]
    assert "drift" in notices[0].text


def test_a_part_has_moved_only_if_its_whole_reading_lies_outside_its_tolerance() -> None:
    part = Part(ref="RB", value=330e3, lower_rel=-0.01, upper_rel=0.01)
    assert moved_by(spread_of(346e3, *ONE), part) == pytest.approx(16 / 330)
    assert moved_by(spread_of(334e3, *ONE), part) is None  # 330.7k to 337.3k reaches 333.3k
    assert moved_by(spread_of(334e3, -0.001, 0.001), part) == pytest.approx(4 / 330)


def test_power_and_voltage_are_named_as_things_to_check() -> None:
    power, voltage = list_checks("resistor", 12.6, 330e3)
    assert "0.48 mW" in power  # 12.6² / 330k
    assert "voltage" in voltage
    assert "12.6 V" in list_checks("capacitor", 12.6, None)[0]
    assert "Polarity" in list_checks("electrolytic", None, None)[1]
