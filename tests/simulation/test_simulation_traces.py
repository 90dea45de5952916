"""What the simulated instrument makes of volts and edges."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from benchtool.circuits import Circuit
from benchtool.errors import UsageError
from benchtool.model.capture import Capture, LogicTrace, Waveform
from benchtool.simulation import Acquisition, Ripple, Truth, simulate
from benchtool.simulation.voltages import filter_steps


def volts(capture: Capture, index: int = 0) -> np.ndarray:
    trace = capture.traces[index]
    assert isinstance(trace, Waveform)
    samples = np.concatenate(list(trace.samples.blocks()))
    return samples * trace.scale.gain + trace.scale.offset


def times(capture: Capture) -> np.ndarray:
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    return np.arange(trace.samples.size) * trace.time.dt_s


def test_a_band_limited_edge_is_the_step_response_of_one_pole(
    spacing: Circuit, rng: np.random.Generator
) -> None:
    bandwidth_hz = 2.0
    acquisition = Acquisition(rate_hz=200.0, periods=3, bandwidth_hz=bandwidth_hz)
    capture, truth = simulate(spacing, acquisition, rng)
    shown, t = volts(capture), times(capture)
    rise = truth.edges_s[np.flatnonzero(truth.edge_rising)[0]]
    after = (t > rise) & (t < rise + 5.0)
    expected = 12.0 * (1 - np.exp(-2 * np.pi * bandwidth_hz * (t[after] - rise)))
    np.testing.assert_allclose(shown[after], expected, atol=1e-12)
    assert np.count_nonzero((shown[after] > 1.2) & (shown[after] < 10.8)) > 10


def test_a_row_of_steps_is_the_sum_of_the_responses_to_each() -> None:
    """Closer together than the time constant, so that none of them comes to rest."""
    bandwidth_hz = 2.0
    tau_s = 1 / (2 * np.pi * bandwidth_hz)
    steps_s = np.array([0.3, 0.34, 0.4, 0.41, 0.9])
    levels_v = np.array([5.0, 0.0, 5.0, 1.0, 3.0])
    t = np.linspace(0.0, 2.0, 801)
    expected = np.zeros_like(t)
    for step_s, rise_v in zip(steps_s, np.diff(levels_v, prepend=0.0), strict=True):
        expected += rise_v * np.where(t >= step_s, 1 - np.exp(-(t - step_s) / tau_s), 0.0)
    shown = filter_steps(steps_s, levels_v, 0.0, t, bandwidth_hz)
    np.testing.assert_allclose(shown, expected, atol=1e-12)


def test_the_node_is_as_integrated(spacing: Circuit, rng: np.random.Generator) -> None:
    acquisition = Acquisition(rate_hz=20.0, periods=2, record=("output", "capacitor"))
    capture, truth = simulate(spacing, acquisition, rng)
    t, node = times(capture), volts(capture, 1)
    fall = int(np.flatnonzero(~np.array(truth.edge_rising))[0])
    begin_s = truth.edges_s[fall]
    inside = (t > begin_s) & (t < begin_s + 10.0)

    def slope(_: float, v: np.ndarray) -> np.ndarray:
        pin = (12 / 100e3 + v / 330e3) / (1 / 100e3 + 1 / 330e3 + 1 / 8.7)
        return ((pin - v) / 330e3 - 0.1e-6) / 47e-6

    solved = solve_ivp(slope, (0, 11), [8.0], rtol=1e-11, atol=1e-12, t_eval=t[inside] - begin_s)
    # the node overshoots by the delay of 0.14 µs: below 1e-7 V
    np.testing.assert_allclose(node[inside], solved.y[0], atol=1e-6)


def test_codes_are_the_nearest_steps_of_the_range(spacing: Circuit) -> None:
    exact = Acquisition(rate_hz=50.0, periods=3, bandwidth_hz=1.0)
    coded = replace(exact, bits=8, full_scale_v=(-2.0, 14.0))
    first, _ = simulate(spacing, exact, np.random.default_rng(1))
    second, _ = simulate(spacing, coded, np.random.default_rng(1))
    step_v = 16.0 / 256
    error = volts(second) - volts(first)
    assert np.abs(error).max() <= step_v / 2 * (1 + 1e-9)
    assert error.std() > 0
    trace = second.traces[0]
    assert isinstance(trace, Waveform)
    assert trace.scale.step_v == pytest.approx(step_v)
    assert np.issubdtype(trace.samples.dtype, np.integer)


def test_codes_end_at_the_ends_of_the_range(spacing: Circuit, rng: np.random.Generator) -> None:
    acquisition = Acquisition(rate_hz=50.0, periods=3, bits=8, full_scale_v=(2.0, 10.0))
    capture, _ = simulate(spacing, acquisition, rng)
    assert volts(capture).min() == pytest.approx(2.0)
    assert volts(capture).max() == pytest.approx(10.0 - 8.0 / 256)


def test_noise_and_offset_are_as_asked(spacing: Circuit) -> None:
    quiet = Acquisition(rate_hz=500.0, periods=3)
    noisy = replace(quiet, noise_v=0.03, offset_v=0.7)
    first, _ = simulate(spacing, quiet, np.random.default_rng(5))
    second, _ = simulate(spacing, noisy, np.random.default_rng(5))
    added = volts(second) - volts(first)
    n = added.size
    assert added.mean() == pytest.approx(0.7, abs=4 * 0.03 / np.sqrt(n))
    assert added.std() == pytest.approx(0.03, rel=4 / np.sqrt(2 * n))


def test_transitions_lie_on_the_tick_after_the_edge(
    spacing: Circuit, rng: np.random.Generator
) -> None:
    acquisition = Acquisition(rate_hz=40.0, periods=5, kind="logic", jitter_rel=1e-3)
    capture, truth = simulate(spacing, acquisition, rng)
    trace = capture.traces[0]
    assert isinstance(trace, LogicTrace)
    np.testing.assert_array_equal(trace.times_s, np.ceil(truth.edges_s * 40) / 40)
    assert tuple(trace.states) == truth.edge_rising
    assert trace.spans[0].starts_high is not truth.edge_rising[0]


def test_two_edges_inside_a_tick_are_not_seen(
    boards: dict[str, Circuit], rng: np.random.Generator
) -> None:
    quick = replace(boards["one-shot"], C=1e-9, delay_upper=0.0)
    acquisition = Acquisition(rate_hz=10.0, duration_s=20.0, trigger_every_s=1.03, kind="logic")
    capture, truth = simulate(quick, acquisition, rng)
    trace = capture.traces[0]
    assert isinstance(trace, LogicTrace)
    assert truth.edges_s.size > 30
    assert trace.times_s.size == 0


def test_sampled_states_are_those_of_the_edges(spacing: Circuit, rng: np.random.Generator) -> None:
    capture, truth = simulate(
        spacing, Acquisition(rate_hz=40.0, periods=4, kind="sampled-logic"), rng
    )
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert trace.is_logic
    states = next(iter(trace.samples.blocks())).astype(bool)
    changes = np.flatnonzero(np.diff(states.astype(np.int8))) + 1
    np.testing.assert_array_equal(changes, np.ceil(truth.edges_s * 40))


def test_power_up_shows_on_output_supply_and_node(
    spacing: Circuit, rng: np.random.Generator
) -> None:
    roles = ("output", "capacitor", "supply")
    acquisition = Acquisition(rate_hz=50.0, periods=2, start_up=True, power_up_s=3.0, record=roles)
    capture, truth = simulate(spacing, acquisition, rng)
    t = times(capture)
    before, after = t < 2.99, (t > 3.01) & (t < 10.0)
    for index in range(3):
        np.testing.assert_allclose(volts(capture, index)[before], 0.0, atol=1e-12)
    np.testing.assert_allclose(volts(capture, 0)[after], 12.0)
    np.testing.assert_allclose(volts(capture, 2)[after], 12.0)
    assert np.all(np.diff(volts(capture, 1)[after]) > 0)
    assert truth.powered_s == 3.0
    assert [trace.channel for trace in capture.traces] == ["OUT", "NODE", "VCC"]


def test_a_ripple_rides_on_the_supply_and_on_the_high_output(
    spacing: Circuit, rng: np.random.Generator
) -> None:
    ripple = Ripple(depth_rel=0.04, frequency_hz=1.7)
    acquisition = Acquisition(rate_hz=50.0, periods=3, ripple=ripple, record=("output", "supply"))
    capture, _ = simulate(spacing, acquisition, rng)
    output, supply = volts(capture, 0), volts(capture, 1)
    high = output > 6
    np.testing.assert_allclose(output[high], supply[high], atol=1e-12)
    np.testing.assert_allclose(output[~high], 0.0, atol=1e-12)
    assert np.ptp(supply) == pytest.approx(2 * 0.04 * 12.0, rel=0.01)


def test_the_trigger_rests_high_and_falls_at_each_pulse(
    boards: dict[str, Circuit], rng: np.random.Generator
) -> None:
    acquisition = Acquisition(
        rate_hz=50.0, periods=5, record=("output", "trigger"), trigger_width_s=0.5
    )
    capture, truth = simulate(boards["one-shot"], acquisition, rng)
    t, trigger = times(capture), volts(capture, 1)
    rises = truth.edges_s[np.array(truth.edge_rising)]
    low = np.zeros(t.size, dtype=bool)
    for rise in rises:
        low |= (t >= rise) & (t < rise + 0.5)
    np.testing.assert_array_equal(trigger[t > 1.0] == 0, low[t > 1.0])


def test_the_same_seed_gives_the_same_capture_and_another_does_not(spacing: Circuit) -> None:
    acquisition = Acquisition(rate_hz=20.0, periods=3, noise_v=0.1, bits=8, jitter_rel=1e-3)
    runs = [simulate(spacing, acquisition, np.random.default_rng(seed)) for seed in (4, 4, 5)]
    first, same, other = (volts(capture) for capture, _ in runs)
    np.testing.assert_array_equal(first, same)
    assert not np.array_equal(first, other)
    assert isinstance(runs[0][1], Truth)
    np.testing.assert_array_equal(runs[0][1].edges_s, runs[1][1].edges_s)


@pytest.mark.parametrize(
    ("settings", "says"),
    [
        ({"rate_hz": 0.0, "periods": 3}, "rate_hz"),
        ({"rate_hz": 10.0}, "duration"),
        ({"rate_hz": 10.0, "periods": 3, "duration_s": 2.0}, "duration"),
        ({"rate_hz": 10.0, "periods": 3, "bits": 1}, "bits"),
        ({"rate_hz": 10.0, "periods": 3, "noise_v": -1.0}, "noise_v"),
        ({"rate_hz": 10.0, "periods": 3, "record": ()}, "record"),
        ({"rate_hz": 10.0, "periods": 3, "timebase_rel": -1.0}, "clock"),
    ],
)
def test_an_impossible_acquisition_is_refused(settings: dict[str, object], says: str) -> None:
    with pytest.raises(UsageError, match=says):
        Acquisition(**settings)


@pytest.mark.parametrize(
    ("settings", "says"),
    [
        ({"rate_hz": 1e9, "duration_s": 1e3}, "samples"),
        ({"rate_hz": 10.0, "periods": 3, "kind": "logic", "record": ("capacitor",)}, "logic"),
    ],
)
def test_what_cannot_be_recorded_is_refused(
    spacing: Circuit, rng: np.random.Generator, settings: dict[str, object], says: str
) -> None:
    with pytest.raises(UsageError, match=says):
        simulate(spacing, Acquisition(**settings), rng)


def test_a_ripple_deeper_than_the_supply_is_refused() -> None:
    with pytest.raises(UsageError, match="ripple"):
        Ripple(depth_rel=1.0, frequency_hz=100.0)
