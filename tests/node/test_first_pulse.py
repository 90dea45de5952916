from __future__ import annotations

import math

import pytest
from node_boards import FAST, board, seconds
from scipy.integrate import quad

from benchtool.circuits import Circuit, predict
from benchtool.errors import SolveError
from benchtool.model.node import FirstPulse, RatioCause
from benchtool.node import judge_first_pulse, solve_schmitt
from benchtool.uncertainty import expanded

IDEAL = Circuit(
    topology="astable", RA=100e3, RB=330e3, C=47e-6, supply=12.0, v_upper=8.0, v_lower=4.0
)
HIGH_S = 430e3 * 47e-6 * math.log(2)


def judged(ratio: float, circuit: Circuit = IDEAL, u_rel: float = 1e-4) -> FirstPulse:
    return judge_first_pulse(
        seconds(ratio * HIGH_S, u_rel * HIGH_S), seconds(HIGH_S, u_rel * HIGH_S), circuit
    )


def cause(found: FirstPulse, name: str) -> RatioCause:
    return next(item for item in found.causes if item.name == name)


def test_the_ideal_ratio_is_ln3_over_ln2() -> None:
    found = judged(math.log(3) / math.log(2))
    assert found.ideal == pytest.approx(1.58496, abs=1e-5)
    assert found.expected == pytest.approx(found.ideal, rel=1e-12)
    assert not found.stands_out
    # u of a quotient: first and steady are known alike, relative to the steady one
    assert found.ratio.u == pytest.approx(1e-4 * math.hypot(1, found.ideal), rel=1e-9)


@pytest.mark.parametrize(
    ("name", "sign"),
    [
        ("upper-threshold", -1),
        ("lower-threshold", 1),
        ("control", -1),
        ("leak", -1),
        ("esr", 1),
        ("residual-charge", -1),
        ("supply-ramp", 1),
    ],
)
def test_each_cause_moves_the_ratio_in_its_own_direction(name: str, sign: int) -> None:
    shift = cause(judged(1.585), name).shift
    assert shift * sign > 1e-4


def test_the_shifts_are_those_of_the_formulas_on_paper() -> None:
    """By ln[(V-v0)/(V-VU)]/ln[(V-VL)/(V-VU)], computed here."""
    found = judged(1.585)
    raised = math.log(12 / (12 - 8.08)) / math.log(8 / (12 - 8.08))
    assert cause(found, "upper-threshold").shift == pytest.approx(raised - found.ideal, rel=1e-9)
    charged = (math.log((12 - 0.12) / 4) - math.log(3)) / math.log(2)
    assert cause(found, "residual-charge").shift == pytest.approx(charged, rel=1e-9)


def test_a_supply_that_rises_slowly_is_as_integrated() -> None:
    """v(t) on a ramp of r by quadrature of the convolution; the rest is one exponential."""
    tau = 430e3 * 47e-6
    found = judged(1.585)
    ramp_s = cause(found, "supply-ramp").size
    at_end = quad(lambda s: 12 * s / ramp_s / tau * math.exp(-(ramp_s - s) / tau), 0, ramp_s)[0]
    first_s = ramp_s + tau * math.log((12 - at_end) / 4)
    assert cause(found, "supply-ramp").shift == pytest.approx(
        first_s / HIGH_S - found.ideal, rel=1e-6
    )


def test_the_size_that_explains_a_ratio_is_found() -> None:
    leaky = board(FAST, shunt_ohm=6e6)
    times = predict(leaky)
    found = judge_first_pulse(
        seconds(float(times.first_high or 0), 1e-7),
        seconds(float(times.t_high or 0), 1e-7),
        board(FAST),
    )
    assert found.stands_out
    assert cause(found, "leak").needed == pytest.approx(6e6, rel=1e-6)
    assert cause(found, "esr").needed is None  # it lengthens the first pulse


def test_a_one_shot_has_no_first_pulse_of_that_kind() -> None:
    one_shot = Circuit(topology="one-shot", R=100e3, C=1e-6, supply=12.0, v_upper=8.0)
    with pytest.raises(SolveError):
        judged(1.585, one_shot)


@pytest.mark.parametrize(
    ("tau_s", "upper", "lower"), [(1e-3, 0.58, 0.36), (20.0, 0.7, 0.2), (5e-6, 0.55, 0.45)]
)
def test_a_schmitt_oscillator_is_solved_from_its_three_times(
    tau_s: float, upper: float, lower: float
) -> None:
    circuit = Circuit(
        topology="schmitt",
        R=10e3,
        C=tau_s / 10e3,
        supply=5.0,
        v_upper=5 * upper,
        v_lower=5 * lower,
    )
    times = predict(circuit)
    values = [float(x or 0) for x in (times.first_high, times.t_high, times.t_low)]
    found = solve_schmitt(*(seconds(x, 1e-4 * x) for x in values))
    assert found.tau.value == pytest.approx(tau_s, rel=1e-9)
    assert found.upper.value == pytest.approx(upper, rel=1e-9)
    assert found.lower.value == pytest.approx(lower, rel=1e-9)
    # Against the spread of solutions of scattered times.
    moved = [
        solve_schmitt(*(seconds(x * (1 + 1e-4 * (i == j)), 0.0) for j, x in enumerate(values)))
        for i in range(3)
    ]
    u = math.hypot(*(item.tau.value - tau_s for item in moved))
    assert found.tau.u == pytest.approx(u, rel=0.02)
    assert expanded(found.tau) < 0.02 * tau_s


@pytest.mark.parametrize("times", [(1.0, 1.2, 1.0), (1.0, 1.0, 1.0), (1.0, 0.5, 0.0)])
def test_times_that_no_schmitt_oscillator_has_are_refused(
    times: tuple[float, float, float],
) -> None:
    with pytest.raises(SolveError):
        solve_schmitt(*(seconds(x, 1e-4) for x in times))


def test_thresholds_that_would_meet_on_the_way_to_a_cause_are_no_fault() -> None:
    near = Circuit(topology="schmitt", R=470e3, C=2.2e-6, supply=12.0, v_upper=6.96, v_lower=4.56)
    times = predict(near)
    assert times.first_high is not None
    assert times.t_high is not None
    first, usual = float(times.first_high), float(times.t_high)
    found = judge_first_pulse(seconds(1.2 * first, 1e-4), seconds(usual, 1e-4), near)
    assert found.stands_out
