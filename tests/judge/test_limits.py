"""Derived limits against brute force over the textbook formulas, and against closed forms."""

import itertools
import math
from dataclasses import replace

import numpy as np
import pytest
from judged_boards import board, ideal_ic, limit, part, single
from scipy import optimize

from benchtool.judge.extremes import TAIL, TRIALS, draw_boards, find_corners
from benchtool.judge.limits import derive_limits, limits_three_ways, stage_limits
from benchtool.model.decision import DerivedLimit
from benchtool.model.design import Band, Ic, Threshold

LN2, LN3 = math.log(2), math.log(3)


def _textbook(RA: float, RB: float, C: float) -> dict[str, float]:
    high, low = (RA + RB) * C * LN2, RB * C * LN2
    return {
        "t_high": high,
        "t_low": low,
        "period": high + low,
        "frequency": 1 / (high + low),
        "duty": high / (high + low),
        "first_high": (RA + RB) * C * LN3,
        "tau_charge": (RA + RB) * C,
        "tau_discharge": RB * C,
    }


def _by_name(*args: object) -> dict[str, DerivedLimit]:
    return {item.quantity: item for item in derive_limits(*args)}


def test_worst_case_agrees_with_every_corner_of_the_textbook_formulas() -> None:
    corners = [
        _textbook(100e3 * (1 + a), 330e3 * (1 + b), 47e-6 * (1 + c))
        for a, b, c in itertools.product((-0.01, 0.01), (-0.01, 0.01), (-0.1, 0.1))
    ]
    derived = _by_name(*board(), "worst-case")
    assert set(derived) == set(corners[0])
    for name, item in derived.items():
        # 1e-12: arithmetic only.
        assert item.nominal == pytest.approx(_textbook(100e3, 330e3, 47e-6)[name], rel=1e-12)
        assert item.lower == pytest.approx(min(corner[name] for corner in corners), rel=1e-12)
        assert item.upper == pytest.approx(max(corner[name] for corner in corners), rel=1e-12)


def test_rss_agrees_with_the_sum_by_hand() -> None:
    derived = _by_name(*board(), "rss")
    ideal = _textbook(100e3, 330e3, 47e-6)
    RA, RB = 100.0, 330.0
    by_hand = {
        "t_low": math.hypot(0.01, 0.1),
        "t_high": math.sqrt((0.01 * RA) ** 2 + (0.01 * RB) ** 2 + (0.1 * (RA + RB)) ** 2)
        / (RA + RB),
        "period": math.sqrt((0.01 * RA) ** 2 + (0.02 * RB) ** 2 + (0.1 * (RA + 2 * RB)) ** 2)
        / (RA + 2 * RB),
    }
    for name, half in by_hand.items():
        assert derived[name].lower == pytest.approx(ideal[name] * (1 - half), rel=1e-12)
        assert derived[name].upper == pytest.approx(ideal[name] * (1 + half), rel=1e-12)


def test_rss_takes_half_the_change_over_an_uneven_range() -> None:
    parts = {"RA": part("RA", 100e3), "RB": part("RB", 330e3), "C": part("C", 47e-6)}
    parts["C"] = replace(parts["C"], lower_rel=-0.2, upper_rel=0.5)
    low = _by_name(*board(parts), "rss")["t_low"]
    nominal = 330e3 * 47e-6 * LN2
    assert low.lower == pytest.approx(nominal * (1 - 0.35), rel=1e-12)
    assert low.upper == pytest.approx(nominal * (1 + 0.35), rel=1e-12)


def test_monte_carlo_of_one_rectangular_part_has_its_analytic_quantiles() -> None:
    parts = single(part("R", 330e3), part("C", 47e-6, 0.1))
    pulse = _by_name(*board(parts, topology="one-shot"), "monte-carlo")["t_high"]
    nominal = 330e3 * 47e-6 * LN3
    # A quantile of n draws scatters by sqrt(p(1-p)/n) in probability; four of these.
    scatter = 0.2 * 4 * math.sqrt(TAIL / TRIALS)
    assert pulse.lower == pytest.approx(nominal * (0.9 + 0.2 * TAIL), abs=nominal * scatter)
    assert pulse.upper == pytest.approx(nominal * (1.1 - 0.2 * TAIL), abs=nominal * scatter)


def test_monte_carlo_of_a_product_has_its_analytic_quantiles() -> None:
    """P(XY <= z) = (z·ln(z/a²) - z + a²)/(b-a)² for X, Y rectangular on [a, b], z near a²."""
    parts = single(part("R", 330e3, 0.1), part("C", 47e-6, 0.1))
    pulse = _by_name(*board(parts, topology="one-shot"), "monte-carlo")["t_high"]
    nominal = 330e3 * 47e-6 * LN3
    a, b = 0.9, 1.1

    def below(z: float) -> float:
        return (z * math.log(z / a**2) - z + a**2) / (b - a) ** 2

    def above(z: float) -> float:
        return (b**2 - z - z * math.log(b**2 / z)) / (b - a) ** 2

    z_low = optimize.brentq(lambda z: below(z) - TAIL, a * a + 1e-9, a * b)
    z_high = optimize.brentq(lambda z: above(z) - TAIL, a * b, b * b - 1e-9)
    deviation = 4 * math.sqrt(TAIL / TRIALS)
    density_low = math.log(z_low / a**2) / (b - a) ** 2
    density_high = math.log(b**2 / z_high) / (b - a) ** 2
    assert pulse.lower / nominal == pytest.approx(z_low, abs=deviation / density_low)
    assert pulse.upper / nominal == pytest.approx(z_high, abs=deviation / density_high)


def _threshold_pulse(shift: float) -> float:
    return -330e3 * 47e-6 * math.log(1 - 2 / 3 * (1 + shift))


def test_ic_terms_are_normal_in_monte_carlo_and_two_u_in_worst_case() -> None:
    u = 0.006
    parts = single(part("R", 330e3), part("C", 47e-6))
    case = board(parts, topology="one-shot", ic=ideal_ic(u_threshold=u))
    worst = _by_name(*case, "worst-case")["t_high"]
    assert worst.lower == pytest.approx(_threshold_pulse(-2 * u), rel=1e-12)
    assert worst.upper == pytest.approx(_threshold_pulse(2 * u), rel=1e-12)
    random = _by_name(*case, "monte-carlo")["t_high"]
    # The pulse rises with the threshold, so its quantile is that of the threshold at ±3u.
    # Normal density at 3 sd: 0.00443/u; four standard deviations of the quantile.
    shift = 4 * math.sqrt(TAIL / TRIALS) / (0.00443 / u)
    assert _threshold_pulse(3 * u - shift) < random.upper < _threshold_pulse(3 * u + shift)
    assert _threshold_pulse(-3 * u - shift) < random.lower < _threshold_pulse(-3 * u + shift)


def test_monte_carlo_repeats_itself() -> None:
    case = board(ic=Ic(family="cmos"))
    assert derive_limits(*case, "monte-carlo") == derive_limits(*case, "monte-carlo")


def test_no_random_board_of_rectangular_parts_lies_beyond_the_corners() -> None:
    """Corners rest on monotony inside the ranges: two hundred thousand boards look for a gap."""
    parts = {
        "RA": part("RA", 100e3, 0.05, tempco_per_k=1e-4),
        "RB": part("RB", 330e3, 0.05, tempco_per_k=-2e-4),
        "C": part("C", 47e-6, 0.2, leakage_a=2e-6, tempco_per_k=2e-3),
    }
    case = board(
        parts,
        ic=ideal_ic(bias_current=1e-7, discharge_resistance=300.0, discharge_saturation=0.1),
        supply=Band(nominal=12.0, lower=10.8, upper=13.2),
        design={"temperature": Band(nominal=25.0, lower=10.0, upper=40.0)},
    )
    corners = find_corners(*case).ranges
    for name, row in draw_boards(*case, 200_000).items():
        low, high = corners[name]
        assert low <= row.min()
        assert row.max() <= high


def test_half_the_leakage_is_nominal_and_its_range_goes_from_none_to_all() -> None:
    parts = single(part("R", 330e3), part("C", 47e-6, leakage_a=1e-6))

    def pulse(leakage_a: float) -> float:
        top = 12 - leakage_a * 330e3
        return 330e3 * 47e-6 * math.log(top / (top - 8))

    item = _by_name(*board(parts, topology="one-shot"), "worst-case")["t_high"]
    assert item.nominal == pytest.approx(pulse(0.5e-6), rel=1e-12)
    assert item.lower == pytest.approx(pulse(0.0), rel=1e-12)
    assert item.upper == pytest.approx(pulse(1e-6), rel=1e-12)


def test_products_are_of_the_parts_alone() -> None:
    """Neither leakage nor a weak discharge switch nor the supply moves R·C itself."""
    leaky = {
        "RA": part("RA", 100e3, 0.01),
        "RB": part("RB", 330e3, 0.01),
        "C": part("C", 47e-6, 0.1, leakage_a=1e-6),
    }
    case = board(
        leaky,
        ic=Ic(family="bipolar"),
        supply=Band(nominal=12.0, lower=11.4, upper=12.6),
    )
    product = _by_name(*case, "worst-case")["tau_charge"]
    assert product.lower == pytest.approx(430e3 * 0.99 * 47e-6 * 0.9, rel=1e-12)
    assert product.upper == pytest.approx(430e3 * 1.01 * 47e-6 * 1.1, rel=1e-12)


def test_a_temperature_range_moves_the_parts() -> None:
    parts = {
        "RA": part("RA", 100e3),
        "RB": part("RB", 330e3),
        "C": part("C", 47e-6, tempco_per_k=1e-3),
    }
    warm = {"temperature": Band(nominal=25.0, lower=15.0, upper=45.0)}
    product = _by_name(*board(parts, design=warm), "worst-case")["tau_discharge"]
    assert product.lower == pytest.approx(330e3 * 47e-6 * 0.99, rel=1e-12)
    assert product.upper == pytest.approx(330e3 * 47e-6 * 1.02, rel=1e-12)


def test_a_dividing_output_has_limits_on_its_own_period_only() -> None:
    derived = _by_name(*board(divide=8), "worst-case")
    assert set(derived) == {"period", "frequency", "tau_charge", "tau_discharge"}
    assert derived["period"].nominal == pytest.approx(
        8 * _textbook(100e3, 330e3, 47e-6)["period"], rel=1e-12
    )


@pytest.mark.parametrize(
    ("topology", "names"),
    [
        ("one-shot", {"t_high", "tau_charge", "tau_discharge"}),
        ("power-on", {"delay", "tau_charge", "tau_discharge"}),
    ],
)
def test_single_runs_have_one_time(topology: str, names: set[str]) -> None:
    parts = single(part("R", 330e3, 0.01), part("C", 47e-6, 0.1))
    assert set(_by_name(*board(parts, topology=topology), "worst-case")) == names


def test_schmitt_thresholds_are_those_stated() -> None:
    parts = single(part("R", 330e3, 0.01), part("C", 1e-6, 0.1))
    ic = replace(
        ideal_ic(), upper_threshold=Threshold(value=0.6), lower_threshold=Threshold(value=0.4)
    )
    item = _by_name(*board(parts, topology="schmitt", ic=ic), "worst-case")["t_high"]
    assert item.upper == pytest.approx(330e3 * 1.01 * 1.1e-6 * math.log(0.6 / 0.4), rel=1e-12)


def _leaky(most_a: float) -> dict[str, object]:
    return {
        "RA": part("RA", 100e3, 0.01),
        "RB": part("RB", 330e3, 0.01),
        "C": part("C", 47e-6, 0.1, leakage_a=most_a),
    }


@pytest.mark.parametrize("method", ["worst-case", "rss", "monte-carlo"])
def test_parts_that_may_stop_the_circuit_leave_the_slow_side_open(method: str) -> None:
    """4 V over 430 kΩ is 9.3 µA: half of 12 µA runs, all of it stops."""
    derived = _by_name(*board(_leaky(12e-6)), method)
    assert derived["t_high"].nominal is not None
    assert derived["t_high"].upper is None
    assert derived["t_high"].lower is not None
    assert (derived["frequency"].lower, derived["frequency"].upper is None) == (None, False)
    assert (derived["duty"].lower, derived["duty"].upper) == (None, None)
    assert derived["tau_charge"].upper is not None
    (notice,) = derived["t_high"].warnings
    assert notice.code == "circuit-may-stop"
    assert derived["tau_charge"].warnings == ()


@pytest.mark.parametrize("method", ["worst-case", "rss", "monte-carlo"])
def test_a_nominal_board_that_stands_still_has_no_nominal_times(method: str) -> None:
    derived = _by_name(*board(_leaky(25e-6)), method)
    assert derived["t_high"].nominal is None
    assert derived["t_low"].nominal is None
    assert derived["period"].upper is None
    assert derived["tau_discharge"].nominal == pytest.approx(330e3 * 47e-6)


def test_rss_names_the_tolerance_that_stops_the_circuit() -> None:
    item = _by_name(*board(_leaky(12e-6)), "rss")["period"]
    assert "leakage at an end of its range" in item.warnings[0].text


def test_rss_of_a_half_stuck_range_takes_the_change_to_the_end_that_runs() -> None:
    parts = _leaky(12e-6) | {"RA": part("RA", 100e3), "RB": part("RB", 330e3)}
    parts["C"] = replace(parts["C"], lower_rel=0.0, upper_rel=0.0)
    item = _by_name(*board(parts), "rss")["t_high"]
    ideal = _textbook(100e3, 330e3, 47e-6)["t_high"]
    assert item.lower == pytest.approx(ideal, rel=1e-9)


def test_rss_of_a_supply_too_low_for_its_control_pin_takes_the_other_end() -> None:
    """11.4 V never reach 11.5 V; 12 V and 12.6 V do."""
    parts = {"RA": part("RA", 100e3), "RB": part("RB", 330e3), "C": part("C", 47e-6)}
    case = board(parts, control_v=11.5, supply=Band(nominal=12.0, lower=11.4, upper=12.6))
    item = _by_name(*case, "rss")["t_high"]
    at_upper = 430e3 * 47e-6 * math.log((12.6 - 5.75) / (12.6 - 11.5))
    assert item.lower == pytest.approx(at_upper, rel=1e-12)
    assert item.upper is None


def test_limits_that_the_design_states_win_with_their_source() -> None:
    case = board(
        derive="worst-case",
        quantities=("t_high", "period"),
        limits=(limit("period", 22.0, 28.0), limit("jitter_period", None, 0.002, relative=True)),
    )
    period, jitter, high = stage_limits(*case)
    assert (period.lower, period.upper) == (22.0, 28.0)
    assert period.source == "drawing GH-MV-07 sheet 4"
    assert period.nominal == pytest.approx(_textbook(100e3, 330e3, 47e-6)["period"])
    assert (jitter.relative, jitter.nominal) == (True, None)
    assert (high.quantity, high.source) == ("t_high", "derived: worst case")


@pytest.mark.parametrize(
    ("method", "words"),
    [
        (None, "worst case"),
        ("worst-case", "worst case"),
        ("rss", "root sum of squares"),
        ("monte-carlo", "Monte Carlo"),
    ],
)
def test_the_source_of_a_derived_limit_is_its_method(method: str | None, words: str) -> None:
    (item,) = stage_limits(*board(derive=method, quantities=("t_low",)))
    assert item.source == f"derived: {words}"


def test_nothing_is_judged_that_the_design_does_not_ask_for() -> None:
    assert stage_limits(*board()) == ()


def test_a_quantity_that_nothing_predicts_gets_no_limit() -> None:
    assert stage_limits(*board(quantities=("delay", "jitter_period"))) == ()


def test_three_ways_beside_the_stated_limit() -> None:
    case = board(
        ic=Ic(family="cmos"),
        derive="rss",
        quantities=("t_high",),
        limits=(limit("period", 22.0, 28.0), limit("jitter_cycle", None, 0.1)),
    )
    rows = {item.quantity: item for item in limits_three_ways(*case, expected_u_rel=0.01)}
    assert [item.method for item in rows["t_high"].derived] == ["worst-case", "rss", "monte-carlo"]
    assert rows["t_high"].used == "rss"
    assert rows["t_high"].lower == rows["t_high"].derived[1].lower
    assert rows["period"].used == "given"
    assert rows["t_low"].used is None
    assert rows["jitter_cycle"].derived == ()
    U = 1.959963984540054 * 0.01 * rows["period"].nominal
    assert rows["period"].room == pytest.approx(6 / (2 * U), rel=1e-12)
    assert rows["jitter_cycle"].room is None


def test_without_an_expected_u_no_room_is_stated() -> None:
    rows = limits_three_ways(*board(ic=Ic(family="cmos")))
    assert {item.U for item in rows} == {None}
    assert {item.room for item in rows} == {None}


@pytest.mark.parametrize("name", ["t_high", "t_low", "period", "frequency", "first_high"])
def test_corners_lie_beyond_quantiles_where_the_parts_dominate(name: str) -> None:
    """Not so for the duty, which hangs on the IC alone: ±2u against the quantiles at ±3u."""
    case = board(ic=Ic(family="cmos"))
    wide, random = (_by_name(*case, method)[name] for method in ("worst-case", "monte-carlo"))
    assert wide.lower < random.lower < wide.nominal < random.upper < wide.upper


def test_draws_are_as_many_as_asked_for() -> None:
    rows = draw_boards(*board(), 70_001)
    assert {row.shape for row in rows.values()} == {(70_001,)}
    assert not np.isnan(rows["period"]).any()
