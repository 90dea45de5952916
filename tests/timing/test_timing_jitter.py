from __future__ import annotations

import tomllib
from pathlib import Path

import numpy as np
import pytest

from benchtool.model.quantity import Bound, Measured
from benchtool.model.timing import EdgeRun, Edges
from benchtool.timing import find_intervals, measure_jitter
from benchtool.timing.jitter import grid_share, neighbour_steps
from benchtool.timing.rounding import observed_variance

VECTORS = tomllib.loads(
    (Path(__file__).parents[1] / "reference" / "jitter_vectors.toml").read_text(encoding="utf-8")
)


def edges_of(rises: np.ndarray, step_s: float = 0.0) -> Edges:
    """Return a wave that rises at these times and falls half way between."""
    times = np.sort(np.concatenate([rises, (rises[1:] + rises[:-1]) / 2])) + 1.0
    run = EdgeRun(
        first=0, stop=times.size, start_s=0.0, end_s=float(times[-1]) + 1, starts_high=False
    )
    return Edges(
        times_s=times,
        rising=np.arange(times.size) % 2 == 0,
        u_s=np.zeros(times.size),
        runs=(run,),
        step_s=step_s,
        resolved=step_s == 0,
    )


def value(quantity: object) -> float:
    assert isinstance(quantity, Measured)
    return quantity.value


def test_seven_edges_give_the_figures_worked_by_hand() -> None:
    known = VECTORS["seven_edges"]
    edges = edges_of(np.array(known["edges"], dtype=float))
    intervals = find_intervals(edges)
    jitter = measure_jitter(intervals, edges)
    assert np.mean(intervals.period_s) == pytest.approx(known["mean"])
    assert value(jitter.period_sd) == pytest.approx(known["sd"], abs=5e-5)  # published digits
    assert value(jitter.period_pp) == pytest.approx(known["peak_to_peak"])
    assert neighbour_steps(intervals) == pytest.approx(known["cycle_steps"])
    assert value(jitter.cycle_peak) == pytest.approx(known["cycle_peak"])


@pytest.mark.parametrize("kind", ["white_edge", "accumulating"])
def test_the_two_kinds_of_noise_show_their_theory(kind: str) -> None:
    rng = np.random.default_rng(1)
    noise = rng.normal(0, 1e-3, 20_001)
    own = np.cumsum(noise) if kind == "accumulating" else noise
    edges = edges_of(np.arange(20_001) * 1.0 + own)
    jitter = measure_jitter(find_intervals(edges), edges)
    # 20,000 periods: relative sd of an sd 0.5 %, of the lag-1 coefficient 0.007
    assert value(jitter.period_sd) == pytest.approx(1e-3 * VECTORS[kind]["period"], rel=0.02)
    assert value(jitter.cycle_rms) == pytest.approx(
        1e-3 * VECTORS[kind]["cycle_to_cycle"], rel=0.02
    )
    assert jitter.lag1 == pytest.approx(VECTORS[kind]["lag1"], abs=0.03)


def test_the_uncertainty_of_a_standard_deviation() -> None:
    edges = edges_of(np.cumsum(np.random.default_rng(2).normal(1, 1e-3, 51)))
    sd = measure_jitter(find_intervals(edges), edges).period_sd
    assert isinstance(sd, Measured)
    # 1/√(2(n-1)), JCGM 100:2008 E.4.3
    assert sd.u / sd.value == pytest.approx(1 / np.sqrt(2 * 49))
    assert sd.n == 50


@pytest.mark.parametrize("sigma", [1.2, 2.0])
def test_the_grid_is_taken_out_of_a_jitter_above_it(sigma: float) -> None:
    rng = np.random.default_rng(3)
    rises = np.round(np.cumsum(rng.normal(100.3, sigma, 5001)))
    edges = edges_of(rises, step_s=1.0)
    jitter = measure_jitter(find_intervals(edges), edges)
    # 5000 periods: 1 % of sd, 1.2 % of the rms of neighbours
    assert value(jitter.period_sd) == pytest.approx(sigma, rel=0.025)
    assert value(jitter.cycle_rms) == pytest.approx(sigma * np.sqrt(2), rel=0.025)


def test_a_jitter_below_the_grid_is_only_bounded() -> None:
    rng = np.random.default_rng(4)
    rises = np.round(np.cumsum(rng.normal(100.3, 0.1, 501)))
    edges = edges_of(rises, step_s=1.0)
    jitter = measure_jitter(find_intervals(edges), edges)
    assert isinstance(jitter.period_sd, Bound)
    assert jitter.period_sd.at_most is not None
    assert jitter.period_sd.at_most >= 0.1
    assert [notice.code for notice in jitter.warnings] == ["jitter-below-grid"]


def test_periods_that_fall_alike_on_the_grid_bound_no_jitter_at_nought() -> None:
    """A jitter whose edges all stay inside one step is not seen at all."""
    rng = np.random.default_rng(6)
    true_s = 0.5 + np.cumsum(rng.normal(100.0, 0.01, 31))
    edges = edges_of(np.floor(true_s), step_s=1.0)
    jitter = measure_jitter(find_intervals(edges), edges)
    assert np.ptp(find_intervals(edges).period_s) == 0
    assert isinstance(jitter.period_sd, Bound)
    assert jitter.period_sd.at_most == pytest.approx(1 / np.sqrt(6))  # two rounding errors
    assert isinstance(jitter.cycle_rms, Bound)
    assert jitter.cycle_rms.at_most == pytest.approx(1 / np.sqrt(2))  # 1, -2, 1 of them


def test_observed_variance_is_that_of_rounded_periods() -> None:
    rng = np.random.default_rng(5)
    for sigma, period in ((0.0, 10.3), (0.15, 10.0), (0.4, 10.5), (1.5, 10.2)):
        start = rng.uniform(0, 1, 200_000)
        rounded = np.ceil(start + period + rng.normal(0, sigma, 200_000)) - np.ceil(start)
        # 200,000 draws: 0.4 % of the variance, and as much of the grid's
        assert observed_variance(sigma, period, 1.0) == pytest.approx(np.var(rounded), abs=0.01)


def test_grid_share_is_the_scatter_of_an_exact_wave() -> None:
    assert grid_share(1.0, 10.3) == pytest.approx(np.sqrt(0.3 * 0.7))
    assert grid_share(1.0, 10.0) == 0
    assert grid_share(0.0, 10.3) == 0


def test_two_periods_are_too_few() -> None:
    edges = edges_of(np.array([0.0, 1.0, 2.0]))
    jitter = measure_jitter(find_intervals(edges), edges)
    assert (jitter.period_sd, jitter.period_pp, jitter.lag1) == (None, None, None)
