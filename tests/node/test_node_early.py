from __future__ import annotations

import math

import numpy as np
import pytest
from node_boards import RA, RB, C, as_node, board, recorded, remembering, volts

from benchtool.circuits import predict
from benchtool.errors import MeasurementError
from benchtool.model.capture import Waveform
from benchtool.model.quantity import Measured
from benchtool.node import find_early_tau
from benchtool.uncertainty import expanded

TAU_S = (RA + RB) * C
RISE_S = TAU_S * math.log(2)


def part_of_a_rise(
    span_s: float, seed: int, noise_v: float = 0.02, length: float = 100
) -> Waveform:
    """Return the first seconds of a rise of the slow board, under noise that remembers."""
    rng = np.random.default_rng(seed)
    t = np.linspace(0, span_s, 2000)
    rise = 12 - 8 * np.exp(-t / TAU_S)
    return as_node(rise + remembering(rng, t.size, noise_v, length), float(t[1]))


@pytest.mark.parametrize(("span_s", "worst_rel"), [(2.0, 0.10), (4.0, 0.05), (8.0, 0.025)])
def test_a_part_of_a_rise_gives_its_time_constant(span_s: float, worst_rel: float) -> None:
    """A seventh to a half of the high time; the supply is known to 20 mV, and drawn so."""
    hits, arrivals = 0, 0
    for seed in range(30):
        end = volts(12 + np.random.default_rng(100 + seed).normal(0, 0.02), 0.02)
        found = find_early_tau(
            part_of_a_rise(span_s, seed), end, begin=volts(4.0), target=volts(8.0)
        )
        assert found.rises
        assert found.covered == pytest.approx(span_s / TAU_S, rel=0.2)
        hits += abs(found.tau.value - TAU_S) <= expanded(found.tau)
        assert found.tau.u < worst_rel * TAU_S
        assert found.arrives
        assert found.length
        arrivals += abs(found.arrives.value - RISE_S) <= expanded(found.arrives)
        assert found.length.value == pytest.approx(found.tau.value * math.log(2), rel=0.05)
    assert hits >= 26  # of 30 at 95 %: fewer has a chance of 1 %
    assert arrivals >= 26


def test_the_error_of_the_asymptote_is_in_the_uncertainty() -> None:
    trace = part_of_a_rise(4.0, 1, noise_v=1e-4)
    near = find_early_tau(trace, volts(12.0, 0.001))
    far = find_early_tau(trace, volts(12.0, 0.1))
    moved = find_early_tau(trace, volts(12.1, 0.001))
    assert near.tau.u < 0.01 * near.tau.value
    assert far.tau.u == pytest.approx(abs(moved.tau.value - near.tau.value), rel=0.05)


def test_thresholds_that_are_known_badly_widen_the_arrival() -> None:
    trace = part_of_a_rise(8.0, 2, noise_v=1e-4)
    sharp = find_early_tau(trace, volts(12.0, 1e-4), target=volts(8.0))
    blurred = find_early_tau(trace, volts(12.0, 1e-4), target=volts(8.0, 0.048))
    assert sharp.arrives
    assert blurred.arrives
    # dt/dVU = tau/(V - VU)
    assert blurred.arrives.u == pytest.approx(0.048 * TAU_S / 4, rel=0.05)
    assert sharp.arrives.u < 0.2 * blurred.arrives.u


def test_the_longest_slope_of_a_record_is_taken() -> None:
    """A record that begins late in a fall and ends late in a rise."""
    t = np.linspace(0, 13, 4000)
    fall = 4 * np.exp(-(t - 3) / (RB * C))
    volts_at = np.where(t < 3, fall, 12 - 8 * np.exp(-(t - 3) / TAU_S))
    rng = np.random.default_rng(0)
    found = find_early_tau(as_node(volts_at + rng.normal(0, 0.01, t.size), t[1]), volts(12.0, 0.01))
    assert found.rises
    assert abs(found.tau.value - TAU_S) < 1.5 * expanded(found.tau)


def test_a_fall_settles_at_zero() -> None:
    t = np.linspace(0, 5, 1000)
    rng = np.random.default_rng(0)
    trace = as_node(8 * np.exp(-t / (RB * C)) + rng.normal(0, 0.01, t.size), float(t[1]))
    found = find_early_tau(trace, volts(0.0, 0.005), target=volts(4.0))
    assert not found.rises
    assert abs(found.tau.value - RB * C) < 1.5 * expanded(found.tau)
    assert found.arrives
    assert found.arrives.value == pytest.approx(RB * C * math.log(2), rel=0.02)


def test_the_simulated_board_agrees() -> None:
    circuit = board()
    found = None
    for seed in range(20):
        trace = recorded(circuit, 0.2, n=3000, seed=seed)
        shown = np.concatenate(list(trace.samples.blocks()))[::300]
        if np.all(np.diff(shown) > 0):  # it happens to hold a part of a rise alone
            found = find_early_tau(trace, volts(12.0, 0.01), begin=volts(4.0), target=volts(8.0))
            break
    assert found
    assert found.length
    t_high = float(predict(circuit).t_high or 0.0)
    assert abs(found.length.value - t_high) < 1.5 * expanded(found.length)


def refusal(trace: Waveform, end: Measured | None) -> str:
    with pytest.raises(MeasurementError) as caught:
        find_early_tau(trace, end)
    assert caught.value.hint
    return caught.value.code


def test_without_its_asymptote_a_part_of_a_slope_is_refused() -> None:
    assert refusal(part_of_a_rise(4.0, 0), None) == "asymptote-unknown"


def test_an_asymptote_that_is_passed_is_refused() -> None:
    assert refusal(part_of_a_rise(8.0, 0), volts(6.0, 0.1)) == "asymptote-passed"


def test_too_short_a_part_is_refused() -> None:
    assert refusal(part_of_a_rise(0.4, 0, noise_v=0.05), volts(12.0, 0.02)) == "slope-too-short"


def test_a_leak_shows_as_an_asymptote_that_disagrees() -> None:
    """The node settles at 9.5 V, and 12 V is what the label says."""
    t = np.linspace(0, 20, 4000)
    rng = np.random.default_rng(0)
    leaking = 9.5 - 5.5 * np.exp(-t / (0.8 * TAU_S)) + rng.normal(0, 0.005, t.size)
    found = find_early_tau(as_node(leaking, float(t[1])), volts(12.0, 0.02))
    assert [notice.code for notice in found.warnings] == ["asymptote-disagrees"]
    assert find_early_tau(part_of_a_rise(8.0, 3), volts(12.0, 0.02)).warnings == ()
