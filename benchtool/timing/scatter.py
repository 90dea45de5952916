"""Type A uncertainty: what the scatter of repeated intervals says of their mean."""

from __future__ import annotations

import math

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.timing.noise import NoiseFit
from benchtool.uncertainty import coverage_factor

ENOUGH = 30
"""Intervals from which the two kinds of noise can be told apart."""

_SPREAD = 0.4
"""Edge noise in grid steps (rounding alone: 0.29) from which rounding errors are random."""

_BATCHES = 12
_LEAST_FOR_BATCHES = 36
_SLOW_NOISE = 2.5  # variance of batch means over what neighbours explain: 1 % of chance at F(11,∞)


@frozen_record(eq=False)
class Mean:
    """A mean of repeated observations.

    Attributes:
        value: The mean.
        u: Its standard uncertainty from the scatter, in the same unit.
        dof: Degrees of freedom of ``u``.
        note: How ``u`` was come by.
    """

    value: float
    u: float
    dof: float
    note: str


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
    if n >= _LEAST_FOR_BATCHES:
        u = two_pass_sd(_batch_means(values)) / math.sqrt(_BATCHES)
        note = f"sd of {_BATCHES} batch means over √{_BATCHES}"
        return Mean(value=value, u=u, dof=_BATCHES - 1, note=note)
    variance = two_pass_sd(values) ** 2 + 2 * max(0.0, neighbours)
    return Mean(value=value, u=math.sqrt(variance / n), dof=n - 1, note=f"sd of {n} over √{n}")


def mean_of_periods(
    period_s: FloatArray, n_chains: int, step_s: float, fit: NoiseFit | None
) -> Mean:
    """Return the mean period with what its scatter says.

    Args:
        period_s: Complete periods in order, seconds, shape (n,) with n >= 2.
        n_chains: Unbroken successions they come in.
        step_s: Grid that the edges lie on, 0 where they are interpolated. Weights gain nothing
            over rounding to a grid unless the edges' own noise spreads it.
        fit: Their two noises told apart, None where they are too few or do not scatter.
    """
    n = period_s.size
    if fit is None:
        return mean_of_widths(period_s)
    length = n // _BATCHES
    slow = _slow_excess(period_s, fit.accumulating_s2 / length + 2.2 * fit.edge_s2 / length**2)
    if slow:
        return _with_slow(fit.plain_s, fit.u_plain_s, slow)
    weighable = n_chains == 1 and fit.edge_s2 >= (_SPREAD * step_s) ** 2
    return _better_mean(fit, n, n_chains, weighable=weighable)


def _better_mean(fit: NoiseFit, n: int, n_chains: int, *, weighable: bool) -> Mean:
    """Return the mean with the smaller U."""
    plain_u = math.sqrt(fit.accumulating_s2 / n + 2 * n_chains * fit.edge_s2 / n**2)
    plain = Mean(
        value=fit.plain_s,
        u=max(plain_u, fit.u_plain_s),
        dof=fit.dof_plain,
        note=f"first to last edge over {n}, accumulating and edge noise told apart",
    )
    weighted = Mean(
        value=fit.weighted_s,
        u=fit.u_weighted_s,
        dof=fit.dof_weighted,
        note=f"weighted mean of {n}, accumulating and edge noise told apart",
    )
    if not weighable:
        return plain
    return min(plain, weighted, key=lambda mean: coverage_factor(mean.dof) * mean.u)


def _slow_excess(values: FloatArray, expected: float) -> float:
    """Return the variance of the mean from changes too slow for neighbours to show, or 0.

    Args:
        values: Observations in order.
        expected: Variance of a batch mean that the fast noise explains.
    """
    if values.size < _LEAST_FOR_BATCHES:
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
    )
