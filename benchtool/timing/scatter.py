"""Type A uncertainty: what the scatter of repeated intervals says of their mean."""

from __future__ import annotations

import math

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.timing import Intervals
from benchtool.timing.blend import blend_period
from benchtool.timing.noise import NoiseFit
from benchtool.timing.rounding import own_deviation

ENOUGH = 30
"""Intervals from which the two kinds of noise can be told apart."""

ENOUGH_FOR_BOTH_WAYS = 8
"""Periods from which the edges of both directions are weighted together."""

_BATCHES = 12
LEAST_FOR_BATCHES = 36
_SLOW_NOISE = 2.5  # variance of batch means over what neighbours explain: 1 % of chance at F(11,∞)


@frozen_record(eq=False)
class Mean:
    """A mean of repeated observations.

    Attributes:
        value: The mean.
        u: Its standard uncertainty from the scatter, in the same unit.
        dof: Degrees of freedom of ``u``.
        note: How ``u`` was come by.
        slow: Whether changes were seen that are slower than neighbours show.
    """

    value: float
    u: float
    dof: float
    note: str
    slow: bool = False


def two_pass_sd(values: FloatArray) -> float:
    """Return the experimental standard deviation (denominator n - 1).

    Args:
        values: Observations, shape (n,) with n >= 2.

    References:
        JCGM 100:2008, equation (4), by the two-pass formula with the correction for the rounding
        of the mean (Chan, Golub & LeVeque 1983, from memory).
    """
    away = values - np.mean(values)
    square = float(away @ away) - float(np.sum(away)) ** 2 / values.size
    return math.sqrt(max(0.0, square) / (values.size - 1))


def lag_one(values: FloatArray) -> float | None:
    """Return the lag-1 autocorrelation coefficient, None for a constant series.

    Args:
        values: Observations in order, shape (n,) with n >= 2.

    References:
        NIST/ITL StRD univariate summary statistics: mean and denominator of the full series.
    """
    away = values - np.mean(values)
    square = float(away @ away)
    return float(away[:-1] @ away[1:]) / square if square > 0 else None


def mean_of_widths(values: FloatArray, neighbours: float = 0.0) -> Mean:
    """Return the mean of observations that nothing but their scatter is known of.

    From 36 on, batch means tell both slow changes, which add to u, and errors that even out
    over some intervals, such as those of a grid, which do not.

    Args:
        values: Observations in order, shape (n,) with n >= 2.
        neighbours: Covariance of neighbours where it is known to be positive.
    """
    n = values.size
    value = float(np.mean(values))
    if n >= LEAST_FOR_BATCHES:
        u = two_pass_sd(_batch_means(values)) / math.sqrt(_BATCHES)
        note = f"sd of {_BATCHES} batch means over √{_BATCHES}"
        return Mean(value=value, u=u, dof=_BATCHES - 1, note=note)
    variance = two_pass_sd(values) ** 2 + 2 * max(0.0, neighbours)
    return Mean(value=value, u=math.sqrt(variance / n), dof=n - 1, note=f"sd of {n} over √{n}")


def mean_of_periods(period_s: FloatArray, n_chains: int, fit: NoiseFit | None) -> Mean:
    """Return the mean period on a grid, first to last edge, with what its scatter says.

    Args:
        period_s: Complete periods in order, seconds, shape (n,) with n >= 2.
        n_chains: Unbroken successions they come in.
        fit: Their two noises told apart, None where they are too few or do not scatter.
    """
    n = period_s.size
    if fit is None:
        return mean_of_widths(period_s)
    slow = slow_excess(period_s, fit.accumulating_s2, fit.edge_s2)
    if slow:
        return _with_slow(fit.plain_s, fit.u_plain_s, slow)
    plain_u = math.sqrt(fit.accumulating_s2 / n + 2 * n_chains * fit.edge_s2 / n**2)
    return Mean(
        value=fit.plain_s,
        u=max(plain_u, fit.u_plain_s),
        dof=fit.dof_plain,
        note=f"first to last edge over {n}, accumulating and edge noise told apart",
    )


def mean_of_both_ways(intervals: Intervals, u_edge_s: float) -> Mean:
    """Return the period from the edges of both directions, whose places are interpolated.

    Args:
        intervals: Intervals of the trace with enough periods to be told apart from chance.
        u_edge_s: What the noise of the samples gives an edge.
    """
    period_s = intervals.period_s
    blend = blend_period(intervals, u_edge_s)
    if blend is None:
        return mean_of_widths(period_s)
    slow = slow_excess(period_s, 2 * blend.width_s2, blend.edge_s2)
    if slow:
        return _with_slow(blend.period_s, blend.u_s, slow)
    return Mean(
        value=blend.period_s,
        u=blend.u_s,
        dof=blend.dof,
        note="edges of both directions, weighted as accumulating and edge noise ask for",
    )


def mean_on_grid(width_s: FloatArray, step_s: float, u_grid_s: float, most_s: float) -> Mean:
    """Return the mean of many widths on a grid, their scatter without that of the grid.

    Args:
        width_s: Widths in order, seconds, shape (n,) with n >= 30.
        step_s: Grid step.
        u_grid_s: What the grid gives their mean.
        most_s: Most that a width can scatter by itself.
    """
    n = width_s.size
    own_s = own_deviation(two_pass_sd(width_s), float(np.mean(width_s)), step_s) or 0.0
    own_s = min(own_s, most_s)
    batch = own_s**2 * _BATCHES / n + _BATCHES**2 * u_grid_s**2
    slow = _batch_excess(width_s, batch)
    if slow:
        return _with_slow(float(np.mean(width_s)), own_s / math.sqrt(n), slow)
    note = f"sd of {n} over √{n}, without that of the grid"
    return Mean(value=float(np.mean(width_s)), u=own_s / math.sqrt(n), dof=n - 1, note=note)


def slow_excess(period_s: FloatArray, accumulating_s2: float, edge_s2: float) -> float:
    """Return the variance of the mean from changes too slow for neighbours to show, or 0.

    Args:
        period_s: Periods in order.
        accumulating_s2: Variance a period of accumulating noise.
        edge_s2: Variance of an edge's time.
    """
    length = period_s.size // _BATCHES
    if not length:
        return 0.0
    return _batch_excess(period_s, accumulating_s2 / length + 2.2 * edge_s2 / length**2)


def _batch_excess(values: FloatArray, expected: float) -> float:
    """Return the variance of the mean that batch means show beyond what is expected, or 0.

    Args:
        values: Observations in order.
        expected: Variance of a batch mean that the fast noise explains.
    """
    if values.size < LEAST_FOR_BATCHES:
        return 0.0
    variance = two_pass_sd(_batch_means(values)) ** 2
    if variance <= _SLOW_NOISE * expected or variance <= (1e-12 * float(np.mean(values))) ** 2:
        return 0.0
    return variance / _BATCHES


def _batch_means(values: FloatArray) -> FloatArray:
    length = values.size // _BATCHES
    means: FloatArray = values[: length * _BATCHES].reshape(_BATCHES, length).mean(axis=1)
    return means


def _with_slow(value: float, fast_u: float, slow: float) -> Mean:
    return Mean(
        value=value,
        u=max(fast_u, math.sqrt(slow)),
        dof=_BATCHES - 1,
        note=f"sd of {_BATCHES} batch means over √{_BATCHES}: slow changes",
        slow=True,
    )
