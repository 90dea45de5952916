"""What a grid does to intervals of known length, against edges rounded one by one."""

import math

import numpy as np
import pytest

from benchtool.judge.plan_grid import mean_width_grid, rounded_variance
from benchtool.timing.grid import width_floor
from benchtool.timing.rounding import observed_variance

N_RECORDS = 200_000
ROUGH = 0.03
"""Six standard errors of a variance from 200,000 rounded intervals, whose kurtosis is below 6."""


@pytest.mark.parametrize("own", [0.0, 0.1, 0.4, 2.0])
@pytest.mark.parametrize("length", [200.37, 200.5, 57.02])
def test_the_variance_of_one_interval_is_that_of_rounded_edges(length: float, own: float) -> None:
    rng = np.random.default_rng(8)
    start = rng.uniform(0, 1, N_RECORDS)
    stop = start + length + own * rng.standard_normal(N_RECORDS)
    seen = np.var(np.floor(stop) - np.floor(start))
    assert rounded_variance(length, 1.0, own) == pytest.approx(seen, rel=ROUGH)


def test_without_scatter_it_is_the_closed_form_of_a_known_fraction() -> None:
    """Ts²·f·(1 - f): an interval of n + f steps counts n + 1 with the chance f."""
    assert rounded_variance(10.3, 1.0, 0.0) == pytest.approx(0.3 * 0.7)
    assert rounded_variance(0.0103, 0.001, 1e-12) == pytest.approx(0.21e-6, rel=1e-3)


def test_it_is_what_measuring_takes() -> None:
    """Both follow one formula; 1e-3: the harmonics beyond which each stops."""
    for own in (0.05, 0.3, 1.0):
        seen = observed_variance(own, 200.37, 1.0)
        assert rounded_variance(200.37, 1.0, own) == pytest.approx(seen, rel=1e-3)


def test_no_grid_leaves_the_scatter_alone() -> None:
    assert rounded_variance(10.3, 0.0, 0.2) == pytest.approx(0.04)
    assert mean_width_grid(25.0, 10, 0.0, 0.0) == 0.0


def test_a_single_width_has_the_error_of_two_rounded_edges() -> None:
    assert mean_width_grid(25.0, 1, 1.0, 0.0) == pytest.approx(1 / math.sqrt(6))


@pytest.mark.parametrize("spacing", [200.37, 200.0])
@pytest.mark.parametrize("n", [5, 20, 60])
def test_the_error_of_a_mean_is_that_of_rounded_edges_over_periods_near_the_true_one(
    n: int, spacing: float
) -> None:
    """The period is known as well as a record tells it, and edges have as much noise as hides."""
    rng = np.random.default_rng(9)
    trials = 20_000
    half = 1 / n
    period = spacing + half * rng.triangular(-1, 0, 1, trials)
    start = rng.uniform(0, 1, trials)
    width = 115.0 + rng.uniform(0, 1, trials)
    rise = start[:, None] + period[:, None] * np.arange(n)
    fall = rise + width[:, None]
    unseen = 1.6 / n
    edges = [edge + unseen * rng.standard_normal(edge.shape) for edge in (rise, fall)]
    error = [np.floor(edge) - edge for edge in edges]
    seen = np.mean(error[1] - error[0], axis=1)
    # five points stand for the triangle, over which edges go in and out of step with the grid
    assert 0.85 < mean_width_grid(spacing, n, 1.0, 0.0) / seen.std() < 1.25


def test_many_widths_out_of_step_come_near_what_measuring_finds() -> None:
    exact = width_floor(1.0, 400, 200.37)
    assert mean_width_grid(200.37, 400, 1.0, 0.0) == pytest.approx(exact, rel=0.5)
