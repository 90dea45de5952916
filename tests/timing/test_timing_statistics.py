from __future__ import annotations

import math
from dataclasses import replace

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
from benchtool.timing.blend import blend_period, widths_in_turn
from benchtool.timing.grid import (
    blurred_width_floor,
    line_misfit,
    period_floor,
    rounding_covariance,
    width_floor,
)
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


def test_the_period_of_edge_noise_comes_near_its_bound() -> None:
    """With n edges of each direction: σ√(6/(n(n² - 1))); first to last gives six times that."""
    n, errors = 100, []
    for seed in range(300):
        board = Board(period_s=10.0, duty=0.6, edge_noise=1e-4)
        times = 1 + edge_times(board, n, np.random.default_rng(seed))[: 2 * n]
        blend = blend_period(find_intervals(edges_at(times, end_s=2000.0)))
        assert blend is not None
        errors.append(blend.period_s - 10)
    # 300 draws fix the rms to 4 %; not knowing that nothing accumulates costs a few percent
    assert np.sqrt(np.mean(np.square(errors))) < 1.15 * 1e-3 * np.sqrt(6 / (n * (n * n - 1)))


@pytest.mark.parametrize("n", [10, 100])
def test_the_period_of_a_wandering_oscillator_comes_near_its_optimum(n: int) -> None:
    errors = []
    for seed in range(300):
        board = Board(period_s=10.0, duty=0.6, wander=1e-4)
        times = 1 + edge_times(board, n, np.random.default_rng(seed))
        blend = blend_period(find_intervals(edges_at(times, end_s=2000.0)))
        assert blend is not None
        errors.append(blend.period_s - 10)
    # the optimum is s/√n; 300 draws fix the rms to 4 %
    assert np.sqrt(np.mean(np.square(errors))) < 1.12 * 1e-3 / np.sqrt(n)


@pytest.mark.parametrize("n", [20, 600])
def test_bands_of_ordinates_give_the_least_squares_period(n: int) -> None:
    """Against the normal equations of the whole covariance matrix, at both ends of the ratio."""
    rng = np.random.default_rng(n)
    board = Board(period_s=10.0, duty=0.6, wander=2e-5, edge_noise=1e-4)
    times = 1 + edge_times(board, n, rng)[: 2 * n]
    found = blend_period(find_intervals(edges_at(times, end_s=20.0 * n)))
    assert found is not None
    width_s = np.diff(times)
    m = width_s.size
    shape = np.stack([np.arange(m) % 2 == 0, np.arange(m) % 2 == 1]).astype(float)
    second = 2 * np.eye(m) - np.eye(m, k=1) - np.eye(m, k=-1)
    inverse = np.linalg.inv(found.width_s2 * np.eye(m) + found.edge_s2 * second)
    means = np.linalg.solve(shape @ inverse @ shape.T, shape @ inverse @ width_s)
    # one ratio stands for all of them, and U for more than the spread at that ratio
    u = math.sqrt(np.linalg.inv(shape @ inverse @ shape.T).sum())
    assert found.period_s == pytest.approx(means.sum(), abs=0.7 * u)
    assert 0.8 < found.u_s / u < 3


def test_gaps_part_the_widths_that_follow_each_other() -> None:
    times = np.array([1.0, 7.0, 11.0, 17.0, 61.0, 67.0, 71.0, 77.0])
    ends = ((0, 4, 0.0, 20.0, False), (4, 8, 58.0, 80.0, True))
    runs = tuple(
        EdgeRun(first=first, stop=stop, start_s=start, end_s=end, starts_high=high)
        for first, stop, start, end, high in ends
    )
    rising = np.array([True, False] * 2 + [False, True] * 2)
    edges = replace(edges_at(times, end_s=80.0), runs=runs, rising=rising)
    rows = widths_in_turn(find_intervals(edges))
    assert [(row.tolist(), high) for row, high in rows] == [
        ([6.0, 4.0, 6.0], True),
        ([6.0, 4.0, 6.0], False),
    ]


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
    assert blurred_width_floor(1.0, 30, 200.0 + 1 / 30, 1 / 30 / math.sqrt(6)) > 0.25 * in_step


def test_an_exact_wave_on_a_grid_fits_a_line_within_one_step() -> None:
    rng = np.random.default_rng(3)
    for n in (3, 10, 300):
        exact = rng.uniform(0, 1) + np.arange(n + 1) * (20 + rng.uniform(0, 1))
        assert line_misfit(np.ceil(exact)) < 1 + 1e-9  # arithmetic
    noisy = np.ceil(exact + rng.normal(0, 0.5, exact.size))
    k = np.arange(noisy.size)
    slopes = np.linspace(-0.02, 0.02, 20_001) + (noisy[-1] - noisy[0]) / k[-1]
    least = min(float(np.ptp(noisy - slope * k)) for slope in slopes)
    # slopes 2e-6 apart, 300 periods: 3e-4 of a step
    assert least - 1e-3 < line_misfit(noisy) <= least + 1e-9


def test_edges_on_one_line_leave_little_noise_open() -> None:
    """Noise that the grid hides, or shows only in part, is still within U of the period."""
    rng = np.random.default_rng(4)
    for n in (10, 30):
        for wander in (0.0, 0.3, 0.6):
            held = []
            for _ in range(60):
                period = 20 + rng.uniform(0, 1)
                widths = period / 2 + rng.normal(0, wander / math.sqrt(2), 2 * n)
                times = np.ceil(rng.uniform(0, 1) + np.concatenate([[1], 1 + np.cumsum(widths)]))
                edges = edges_at(times, end_s=1e3, step_s=1.0)
                found = measured(timing_of(edges, timebase_rel=0.0).period)
                held.append(abs(found.value - period) <= expanded(found))
            # 60 draws fix 0.95 to 0.028; three of these below
            assert np.mean(held) > 0.865, (n, wander)


@pytest.mark.parametrize("variance", [1e-4, 0.004, 0.1])
def test_the_covariance_of_rounding_is_its_series(variance: float) -> None:
    cycles = np.random.default_rng(5).uniform(0, 9, 50)
    k = np.arange(1, 2000)[:, None]
    damping = np.exp(-2 * math.pi**2 * k**2 * variance)
    series = np.sum(np.cos(2 * math.pi * k * cycles) * damping / (math.pi * k) ** 2, axis=0)
    # harmonics beyond the twentieth hold at most 1/(20·π²), damped or kept
    found = rounding_covariance(cycles, np.full(50, variance))
    assert found == pytest.approx(series, abs=0.0051)


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
