from __future__ import annotations

import math

import numpy as np
import pytest
from timing_waves import Board, as_waveform, cut_record, edge_times, transitions, trapezoid

from benchtool.errors import MeasurementError
from benchtool.model.quantity import Bound, Measured
from benchtool.model.timing import EdgeRun, Edges, Timing
from benchtool.timing import (
    find_edges,
    find_intervals,
    find_levels,
    measure_delay,
    measure_timing,
    require_intervals,
    require_states,
)
from benchtool.timing.grid import blurred_width_floor, period_floor, width_floor
from benchtool.timing.noise import fit_noise
from benchtool.uncertainty import expanded, propagate


def edges_at(times: np.ndarray, *, end_s: float, step_s: float = 0.0) -> Edges:
    run = EdgeRun(first=0, stop=times.size, start_s=0.0, end_s=end_s, starts_high=False)
    return Edges(
        times_s=times,
        rising=np.arange(times.size) % 2 == 0,
        u_s=np.zeros(times.size),
        runs=(run,),
        step_s=step_s,
        resolved=step_s == 0,
    )


def timing_of(edges: Edges, **options: float) -> Timing:
    return measure_timing(find_intervals(edges), edges, **options)


def steady(n: int) -> np.ndarray:
    return 1.0 + np.concatenate([[0], np.cumsum(np.tile([14.0, 10.0], n))])


def measured(quantity: object) -> Measured:
    assert isinstance(quantity, Measured)
    return quantity


def part(quantity: object, source: str) -> float:
    return sum(term.u for term in measured(quantity).budget if term.source == source)


def test_timebase_is_common_and_cancels_in_the_duty() -> None:
    timing = timing_of(edges_at(steady(5), end_s=130.0), timebase_rel=100e-6)
    # rectangular half-width 100 ppm: u = 100 ppm/√3 of the value (JCGM 100:2008, 4.3.7)
    assert part(timing.period, "timebase") == pytest.approx(24 * 100e-6 / np.sqrt(3))
    assert part(timing.duty, "timebase") == 0
    ratio = propagate(
        14 / 24, "1", [(1 / 24, measured(timing.t_high)), (-14 / 24**2, measured(timing.period))]
    )
    assert ratio.u == pytest.approx(0, abs=1e-12)


def test_frequency_is_the_reciprocal_of_the_period() -> None:
    timing = timing_of(edges_at(steady(5), end_s=130.0))
    period, frequency = measured(timing.period), measured(timing.frequency)
    assert frequency.value == 1 / period.value
    assert frequency.u / frequency.value == pytest.approx(period.u / period.value)
    assert part(frequency, "timebase") < 0 < part(period, "timebase")


def test_a_level_error_moves_high_and_low_opposite_ways() -> None:
    rng = np.random.default_rng(1)
    times = np.arange(20_000) * 1e-5
    board = Board(period_s=2.3e-3, duty=0.6)
    wave = trapezoid(times, edge_times(board, 80, rng) + 1e-3, 3e-4)
    trace = as_waveform(5 * wave + rng.normal(0, 0.05, times.size), 1e-5)
    timing = timing_of(find_edges(trace))
    high, low = part(timing.t_high, "level"), part(timing.t_low, "level")
    assert high == -low > 0
    both = propagate(2.3e-3, "s", [(1.0, measured(timing.t_high)), (1.0, measured(timing.t_low))])
    assert part(both, "level") == 0
    assert part(timing.duty, "level") == pytest.approx(high / 2.3e-3, rel=1e-3)


def test_one_interval_takes_the_assumed_jitter() -> None:
    timing = timing_of(edges_at(steady(1)[:3], end_s=30.0), jitter_rel=2e-3, timebase_rel=0.0)
    assert measured(timing.t_high).u == pytest.approx(14 * 2e-3 / np.sqrt(3))
    assert [notice.code for notice in timing.warnings] == ["single-interval"]


def test_two_intervals_are_both_shown_and_weigh_with_one_degree_of_freedom() -> None:
    times = np.array([1.0, 15.0, 25.0, 39.2, 49.0])
    timing = timing_of(edges_at(times, end_s=50.0), timebase_rel=0.0)
    high = measured(timing.t_high)
    # s/√2 of 14.0 and 14.2; t(0.975, 1) = 12.706 (Abramowitz & Stegun table 26.10)
    assert (high.value, high.u, high.dof) == pytest.approx((14.1, 0.1, 1.0))
    assert expanded(high) == pytest.approx(1.2706, abs=1e-4)
    assert "14 s and 14.2 s" in timing.warnings[0].text


def test_few_intervals_that_agree_on_a_grid_are_no_surer_than_the_grid() -> None:
    timing = timing_of(edges_at(steady(3), end_s=80.0, step_s=1.0), timebase_rel=0.0)
    assert measured(timing.t_high).u >= 1 / np.sqrt(6 * 3)


@pytest.mark.parametrize("beat", [0.0, 0.013, 0.25, 0.381966])
def test_the_grid_floor_is_the_rms_error_over_all_phases(beat: float) -> None:
    """Rounding the edges of an exact wave, at every phase, gives the error of the mean width."""
    n, period, width = 40, 7 + beat, 3.3
    phases = (np.arange(4000) + 0.5) / 4000
    start = phases[:, None] + np.arange(n) * period
    mean = np.mean(np.ceil(start + width) - np.ceil(start), axis=1)
    # the floor assumes nothing of the width; averaged over widths it is exact to the sampling
    errors = []
    for width in np.linspace(3, 4, 41)[:-1]:
        mean = np.mean(np.ceil(start + width) - np.ceil(start), axis=1)
        errors.append(np.mean((mean - width) ** 2))
    assert width_floor(1.0, n, period) == pytest.approx(np.sqrt(np.mean(errors)), rel=0.02)


def test_the_period_floor_counts_two_edges() -> None:
    # two edges, each uniform in one step: √(2/12)/n
    assert period_floor(0.5, 10) == pytest.approx(0.5 * np.sqrt(2 / 12) / 10)


@pytest.mark.parametrize(
    ("wander", "edge"), [(1.0, 0.0), (0.0, 1.0), (1.0, 1.0)], ids=["wander", "edge", "both"]
)
def test_two_noises_are_told_apart(wander: float, edge: float) -> None:
    found = []
    for seed in range(40):
        rng = np.random.default_rng(seed)
        noise = rng.normal(0, edge, 401)
        fit = fit_noise(100 + rng.normal(0, wander, 400) + np.diff(noise))
        assert fit is not None
        found.append((fit.accumulating_s2, fit.edge_s2))
    # 16,000 periods fix each variance to a few percent of the larger; the edge variance is the
    # largest of several estimates, which raises it by a little more
    assert np.mean(found, axis=0) == pytest.approx([wander**2, edge**2], abs=0.1)


def test_edge_noise_is_averaged_better_than_first_to_last() -> None:
    """The bound for white edge noise is σ√(12/n³); first to last gives σ√2/n."""
    n, errors = 100, []
    for seed in range(300):
        rng = np.random.default_rng(seed)
        fit = fit_noise(10 + np.diff(rng.normal(0, 1e-3, n + 1)))
        assert fit is not None
        errors.append(fit.weighted_s - 10)
    bound = 1e-3 * np.sqrt(12 / (n * (n + 1) * (n + 2)))
    # 300 draws fix the rms to 4 %; caution about hidden wander costs up to a fifth
    assert np.sqrt(np.mean(np.square(errors))) < 1.3 * bound


def test_wandering_is_averaged_by_first_to_last() -> None:
    n, errors = 100, []
    for seed in range(300):
        fit = fit_noise(10 + np.random.default_rng(seed).normal(0, 1e-3, n))
        assert fit is not None
        errors.append(fit.weighted_s - 10)
    # the optimum is s/√n; 300 draws fix the rms to 4 %
    assert np.sqrt(np.mean(np.square(errors))) < 1.1 * 1e-3 / np.sqrt(n)


def test_slow_changes_are_not_averaged_away() -> None:
    rng = np.random.default_rng(2)
    slow = np.repeat(rng.normal(0, 0.05, 12), 10)
    widths = np.ravel(np.column_stack([14 + slow, np.full(120, 10.0)]))
    timing = timing_of(edges_at(1 + np.concatenate([[0], np.cumsum(widths)]), end_s=3000.0))
    # twelve independent changes of 0.05 s: 0.05/√12, a third of it for the chance of a small sd
    assert measured(timing.period).u > 0.05 / np.sqrt(12) * 0.67


def test_a_trend_is_reported_as_drift() -> None:
    widths = np.tile([14.0, 10.0], 60) * np.repeat(1 + 1e-4 * np.arange(60), 2)
    times = np.cumsum(np.concatenate([[1.0], widths]))
    drift = timing_of(edges_at(times, end_s=2000.0)).drift
    # 1e-4 a period of 24 s
    assert measured(drift).value == pytest.approx(1e-4 / 24, rel=0.01)


def test_steady_noise_is_no_drift() -> None:
    board = Board(period_s=24.0, duty=0.6, wander=1e-3)
    for seed in range(40):
        times = edge_times(board, 200, np.random.default_rng(seed)) + 1
        # four standard uncertainties: one false alarm in 400 runs of this test
        assert timing_of(edges_at(times, end_s=5000.0)).drift is None


def test_duty_of_few_cycles_knows_that_neighbours_share_edges() -> None:
    """A cycle ends with the edge that the next begins with: errors σ√(2/n), not σ√(1.5/n)."""
    n, sigma, found = 8, 1e-3, []
    board = Board(period_s=1.0, duty=0.5, edge_noise=sigma)
    for seed in range(400):
        times = edge_times(board, n, np.random.default_rng(seed)) + 1
        found.append(measured(timing_of(edges_at(times, end_s=10.0)).duty).u ** 2)
    # 400 variances of 7 degrees of freedom scatter by 2.7 %, and the sd of cycles that are alike
    # is 3 % low; a covariance that cannot be negative adds some. Unaware of it: 0.72
    assert 0.85 < np.mean(found) / (2 * sigma**2 / n) < 1.25


def test_directions_that_differ_are_told() -> None:
    rises = np.arange(20) * 24.0 + 1
    falls = rises + 12 + 0.2 * np.arange(20)
    times = np.sort(np.concatenate([rises, falls]))
    timing = timing_of(edges_at(times, end_s=500.0))
    assert "directions-differ" in [notice.code for notice in timing.warnings]
    assert "directions-differ" not in [
        notice.code for notice in timing_of(edges_at(steady(20), end_s=500.0)).warnings
    ]


def test_nothing_complete_gives_bounds() -> None:
    timing = timing_of(edges_at(np.array([3.0]), end_s=10.0))
    assert timing.t_low == Bound(unit="s", at_least=3.0)
    assert timing.t_high == Bound(unit="s", at_least=7.0)
    assert timing.period == Bound(unit="s", at_least=10.0)
    assert timing.frequency == Bound(unit="Hz", at_most=0.1)
    assert timing.duty is None


def test_no_interval_is_refused_with_the_bound_and_what_is_needed() -> None:
    edges = edges_at(np.array([3.0]), end_s=10.0)
    with pytest.raises(MeasurementError, match="at least 10 s") as caught:
        require_intervals(find_intervals(edges), edges)
    assert caught.value.code == "no-interval"
    assert "30 s" in caught.value.hint


def test_too_few_samples_a_period_are_refused_with_the_rate_needed() -> None:
    edges = edges_at(steady(10), end_s=300.0, step_s=8.0)
    with pytest.raises(MeasurementError, match="3 samples") as caught:
        require_intervals(find_intervals(edges), edges)
    assert caught.value.code == "under-sampled"
    assert "417 mHz" in caught.value.hint


@pytest.mark.parametrize(
    ("samples", "code"),
    [
        (np.full(100, 5.0), "flat-trace"),
        (np.random.default_rng(1).normal(0, 1, 1000), "noise-only"),
    ],
    ids=["flat", "noise"],
)
def test_traces_without_states_are_refused(samples: np.ndarray, code: str) -> None:
    with pytest.raises(MeasurementError) as caught:
        require_states(find_levels(as_waveform(samples, 1e-5)))
    assert caught.value.code == code


def test_first_high_has_its_own_figure() -> None:
    times = steady(4)
    times[1:] += 8.19
    timing = timing_of(edges_at(times, end_s=150.0))
    assert measured(timing.first_high).value == pytest.approx(22.19)
    assert measured(timing.t_high).value == pytest.approx(14.0)


def test_delay_runs_from_the_first_edge_to_the_answer() -> None:
    start, answer = edges_at(np.array([2.0]), end_s=9.0), edges_at(np.array([1.0, 5.5]), end_s=9.0)
    delay = measured(measure_delay(start, answer, jitter_rel=1e-3, timebase_rel=0.0))
    assert (delay.value, delay.u) == pytest.approx((3.5, 3.5e-3 / np.sqrt(3)))
    assert measure_delay(answer, start, jitter_rel=1e-3) is not None
    assert measure_delay(edges_at(np.empty(0), end_s=9.0), answer) is None


def test_ticks_of_a_logic_capture_bound_the_error() -> None:
    rng = np.random.default_rng(4)
    board = Board(period_s=24.37e-3, duty=0.6)
    edges = edge_times(board, 12, rng)
    trace = transitions(edges, *cut_record(edges, 10, 2e-3, rng), 1e-3)
    timing = timing_of(find_edges(trace), timebase_rel=0.0)
    assert abs(measured(timing.period).value - board.period_s) <= expanded(measured(timing.period))
    assert expanded(measured(timing.period)) < 1e-3


def test_a_measured_period_does_not_promise_edges_out_of_step_with_the_grid() -> None:
    """30 widths whose edges stay in step carry the whole rounding error of one, Ts/√6."""
    in_step = width_floor(1.0, 30, 200.0)
    out_of_step = width_floor(1.0, 30, 200.0 + 1 / 30)
    assert in_step == pytest.approx(1 / math.sqrt(6), rel=1e-9)
    assert out_of_step < 0.05 * in_step
    assert blurred_width_floor(1.0, 30, 200.0 + 1 / 30) > 0.25 * in_step


@pytest.mark.parametrize(
    ("answers", "delay"),
    [([2.05, 16.0], 14.0), ([16.0], 14.0), ([2.05], None), ([2.0, 16.0], 14.0)],
)
def test_a_rise_together_with_the_supply_is_no_answer(
    answers: list[float], delay: float | None
) -> None:
    supply = edges_at(np.array([2.0]), end_s=30.0)
    found = measure_delay(supply, edges_at(np.array(answers), end_s=30.0), powers=True)
    if delay is None:
        assert found == Bound(unit="s", at_least=28.0)
    else:
        assert measured(found).value == pytest.approx(delay, abs=1e-12)  # arithmetic
