"""The simulated board keeps the times that the integrated node equation gives."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from benchtool.circuits import Circuit, apply_fault, predict
from benchtool.errors import UsageError
from benchtool.selftest.integration import integrate_times
from benchtool.simulation import Acquisition, Ripple, Truth, simulate

OSCILLATORS = ("astable", "astable-diode", "output-fed", "schmitt")


def high_and_low(truth: Truth) -> tuple[np.ndarray, np.ndarray]:
    lengths, rising = np.diff(truth.edges_s), np.array(truth.edge_rising[:-1])
    return lengths[rising], lengths[~rising]


@pytest.mark.parametrize("name", OSCILLATORS)
def test_every_interval_is_as_integrated(
    name: str, boards: dict[str, Circuit], rng: np.random.Generator
) -> None:
    _, truth = simulate(boards[name], Acquisition(rate_hz=50.0, periods=6), rng)
    high, low = high_and_low(truth)
    integrated = integrate_times(boards[name])
    # 1e-9: the integrator's own tolerance is 1e-12 a step
    np.testing.assert_allclose(high, integrated["t_high"], rtol=1e-9)
    np.testing.assert_allclose(low, integrated["t_low"], rtol=1e-9)
    assert truth.period == pytest.approx(integrated["period"], rel=1e-9)
    assert truth.duty == pytest.approx(integrated["duty"], rel=1e-9)


@pytest.mark.parametrize("name", OSCILLATORS)
def test_after_power_up_the_first_high_is_long_and_the_rest_is_as_ever(
    name: str, boards: dict[str, Circuit], rng: np.random.Generator
) -> None:
    acquisition = Acquisition(rate_hz=50.0, periods=6, start_up=True, power_up_s=2.0)
    _, truth = simulate(boards[name], acquisition, rng)
    high, _ = high_and_low(truth)
    integrated = integrate_times(boards[name])
    assert truth.edges_s[0] == 2.0
    assert high[0] == pytest.approx(integrated["first_high"], rel=1e-9)
    np.testing.assert_allclose(high[1:], integrated["t_high"], rtol=1e-9)


@pytest.mark.parametrize("delay_s", [0.02, 2.0])
def test_a_diode_may_go_off_inside_the_delay_of_the_ic(
    delay_s: float, boards: dict[str, Circuit], rng: np.random.Generator
) -> None:
    """The node crosses 7.5 V with the diode on, and turns after it has gone off at 7.6 V."""
    board = replace(boards["astable-diode"], v_upper=7.5, delay_upper=delay_s)
    _, truth = simulate(board, Acquisition(rate_hz=50.0, periods=4), rng)
    high, low = high_and_low(truth)
    integrated = integrate_times(board)
    np.testing.assert_allclose(high, integrated["t_high"], rtol=1e-9)
    np.testing.assert_allclose(low, integrated["t_low"], rtol=1e-9)


def test_a_one_shot_answers_each_trigger_with_its_pulse(
    boards: dict[str, Circuit], rng: np.random.Generator
) -> None:
    pulse_s = integrate_times(boards["one-shot"])["t_high"]
    acquisition = Acquisition(rate_hz=50.0, duration_s=11 * pulse_s, trigger_every_s=2.5 * pulse_s)
    _, truth = simulate(boards["one-shot"], acquisition, rng)
    high, low = high_and_low(truth)
    np.testing.assert_allclose(high, pulse_s, rtol=1e-9)
    np.testing.assert_allclose(low, 1.5 * pulse_s, rtol=1e-9)


def test_a_trigger_inside_the_pulse_does_nothing(
    boards: dict[str, Circuit], rng: np.random.Generator
) -> None:
    pulse_s = integrate_times(boards["one-shot"])["t_high"]
    acquisition = Acquisition(rate_hz=50.0, duration_s=9 * pulse_s, trigger_every_s=0.8 * pulse_s)
    _, truth = simulate(boards["one-shot"], acquisition, rng)
    high, low = high_and_low(truth)
    np.testing.assert_allclose(high, pulse_s, rtol=1e-9)
    np.testing.assert_allclose(low, 0.6 * pulse_s, rtol=1e-9)
    assert truth.period == pytest.approx(1.6 * pulse_s, rel=1e-9)


def test_the_output_rises_the_delay_after_power_up(
    boards: dict[str, Circuit], rng: np.random.Generator
) -> None:
    delay_s = integrate_times(boards["power-on"])["delay"]
    acquisition = Acquisition(rate_hz=50.0, duration_s=3 * delay_s, power_up_s=1.0)
    _, truth = simulate(boards["power-on"], acquisition, rng)
    assert truth.edges_s == pytest.approx([1.0 + delay_s], rel=1e-9)
    assert truth.edge_rising == (True,)
    assert truth.delay == pytest.approx(delay_s, rel=1e-9)


def test_a_capacitor_a_fifth_low_shortens_both_times_by_a_fifth(
    spacing: Circuit, rng: np.random.Generator
) -> None:
    ideal = replace(spacing, delay_upper=0.0, delay_lower=0.0)
    acquisition = Acquisition(rate_hz=50.0, periods=4)
    healthy = high_and_low(simulate(ideal, acquisition, rng)[1])
    low_c = high_and_low(simulate(apply_fault("C-low", ideal, -0.2), acquisition, rng)[1])
    for before, after in zip(healthy, low_c, strict=True):
        assert after.mean() / before.mean() == pytest.approx(0.8, rel=1e-12)


def test_a_leaky_capacitor_lengthens_the_high_and_shortens_the_low_time(
    spacing: Circuit, rng: np.random.Generator
) -> None:
    acquisition = Acquisition(rate_hz=50.0, periods=4)
    leaky = apply_fault("C-leaky", spacing, 5e6)
    _, before = simulate(spacing, acquisition, rng)
    _, after = simulate(leaky, acquisition, rng)
    assert after.t_high > 1.05 * before.t_high
    assert after.t_low < 0.97 * before.t_low


def test_the_variance_of_an_edge_grows_with_its_number(
    spacing: Circuit, rng: np.random.Generator
) -> None:
    jitter_rel, n_boards, n_periods = 2e-3, 400, 24
    acquisition = Acquisition(rate_hz=4.0, periods=n_periods + 3, jitter_rel=jitter_rel)
    elapsed = np.empty((n_boards, n_periods))
    for row in elapsed:
        _, truth = simulate(spacing, acquisition, rng)
        rises = truth.edges_s[np.array(truth.edge_rising)]
        row[:] = rises[1 : n_periods + 1] - rises[0]
    period_s = predict(spacing).period
    after = np.arange(1, n_periods + 1)
    ratio = elapsed.var(axis=0, ddof=1) / (after * (jitter_rel * period_s) ** 2)
    # a sample variance of 400 has a relative sd of √(2/399) = 0.071; 4 of them either way
    np.testing.assert_allclose(ratio, 1.0, atol=0.29)
    np.testing.assert_allclose(elapsed.mean(axis=0) / (after * period_s), 1.0, atol=6e-4)


def test_the_jitter_of_successive_periods_is_independent(
    spacing: Circuit, rng: np.random.Generator
) -> None:
    acquisition = Acquisition(rate_hz=2.0, periods=4000, jitter_rel=1e-3)
    _, truth = simulate(spacing, acquisition, rng)
    periods = np.diff(truth.edges_s[np.array(truth.edge_rising)])
    lag1 = np.corrcoef(periods[:-1], periods[1:])[0, 1]
    assert abs(lag1) < 4 / np.sqrt(periods.size)  # sd of a zero correlation is 1/√n
    assert periods.std(ddof=1) / periods.mean() == pytest.approx(1e-3, rel=4 / np.sqrt(8000))


def test_a_divided_output_counts_the_cycles(spacing: Circuit, rng: np.random.Generator) -> None:
    divided = replace(spacing, divide=4)
    _, truth = simulate(divided, Acquisition(rate_hz=10.0, periods=5), rng)
    assert truth.period == pytest.approx(4 * predict(spacing).period)
    np.testing.assert_allclose(np.diff(truth.edges_s), truth.period / 2, rtol=1e-9)


def test_a_stuck_board_gives_a_flat_output_and_no_times(
    spacing: Circuit, rng: np.random.Generator
) -> None:
    stuck = apply_fault("C-leaky", spacing, 500e3)
    acquisition = Acquisition(rate_hz=10.0, duration_s=60.0)
    capture, truth = simulate(stuck, acquisition, rng)
    volts = next(iter(capture.traces[0].samples.blocks()))
    assert np.ptp(volts) == 0
    assert volts[0] == 12.0
    assert truth.t_high is None
    assert truth.stuck is not None
    assert truth.stuck.startswith("high")
    assert truth.edges_s.size == 0


def test_the_clock_stretches_what_it_shows_and_not_the_truth(
    spacing: Circuit, rng: np.random.Generator
) -> None:
    acquisition = Acquisition(rate_hz=1e4, periods=4, kind="logic", timebase_rel=1e-3)
    capture, truth = simulate(spacing, acquisition, rng)
    shown = capture.traces[0].times_s
    # transitions are seen at the first tick after they happen
    late = shown - truth.edges_s * (1 + 1e-3)
    assert truth.period == pytest.approx(predict(spacing).period)
    assert np.all((late > -1e-9) & (late < 1e-4 + 1e-9))


def test_a_ripple_ends_each_interval_where_the_threshold_first_meets_the_node(
    spacing: Circuit, rng: np.random.Generator
) -> None:
    """A ripple that the node is too slow to follow: it meets the threshold's nearest excursion."""
    depth = 0.03
    board = replace(spacing, r_on=0.0, i_leak=0.0)
    ripple = Ripple(depth_rel=depth, frequency_hz=100.0)
    _, truth = simulate(board, Acquisition(rate_hz=10.0, periods=6, ripple=ripple), rng)
    upper, lower = 8.0 * (1 - depth), 4.0 * (1 + depth)
    t_high = 430e3 * 47e-6 * np.log((12 - lower) / (12 - upper))
    t_low = 330e3 * 47e-6 * np.log(upper / lower)
    # the excursion comes round every 10 ms
    assert truth.t_high == pytest.approx(t_high, abs=10e-3)
    assert truth.t_low == pytest.approx(t_low, abs=10e-3)


def test_ripple_and_jitter_together_are_refused(spacing: Circuit, rng: np.random.Generator) -> None:
    ripple = Ripple(depth_rel=0.03, frequency_hz=100.0)
    acquisition = Acquisition(rate_hz=10.0, periods=6, ripple=ripple, jitter_rel=1e-3)
    with pytest.raises(UsageError, match="not simulated together"):
        simulate(spacing, acquisition, rng)


def test_a_slow_ripple_changes_nothing(spacing: Circuit, rng: np.random.Generator) -> None:
    """All voltages follow the supply in proportion, so one that hardly moves moves no time."""
    board = replace(spacing, i_leak=0.0)
    ripple = Ripple(depth_rel=0.05, frequency_hz=1e-6)
    _, truth = simulate(board, Acquisition(rate_hz=10.0, periods=3, ripple=ripple), rng)
    assert truth.t_high == pytest.approx(predict(board).t_high, rel=1e-5)
    assert truth.t_low == pytest.approx(predict(board).t_low, rel=1e-5)
