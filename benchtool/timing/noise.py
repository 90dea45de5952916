"""Two kinds of noise in a row of periods on a grid, told apart.

An oscillator's own noise adds up: each period is off by an independent amount of variance
``s2``. Noise of measuring an edge does not: it lengthens one period and shortens the next, by a
variance ``q2`` an edge. Together the periods have the covariance matrix s2·I + q2·K with K the
second difference (2 on the diagonal, -1 beside it), whose eigenvectors are sines with the
eigenvalues 2 - 2·cos(πk/(n+1)). So in the sine transform of the periods each ordinate is
independent: edge noise rules the upper half, the oscillator's the lowest ordinates. Rounding to a
grid counts as edge noise; where it repeats it stands out as lines, which are cut back.
"""

from __future__ import annotations

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray

_SCORING_STEPS = 100
_LEAST_DOF = 3.0
_FAR = 9.0
"""Power over its expectation from which an ordinate is a line, not noise, and is cut back."""

_KEPT = 0.995
"""Mean of min(χ², 9) with one degree of freedom: what cutting back leaves of noise."""


_ROUNDING = 0.35
"""Share of the variance of rounding that shows in the slow half of the periods."""
_DIRECT = 256
"""Values up to which the sine transform is a sum: the fast one takes 6 ms to load."""


@frozen_record(eq=False)
class NoiseFit:
    """Variances of the two noises, and the mean of the periods with what it is worth.

    Attributes:
        accumulating_s2: Variance a period of the oscillator's own noise, s².
        edge_s2: Variance of an edge's measured time, rounding to the grid included, s².
        plain_s: Mean of all periods, seconds.
        u_plain_s, dof_plain: Its standard uncertainty and degrees of freedom.
    """

    accumulating_s2: float
    edge_s2: float
    plain_s: float
    u_plain_s: float
    dof_plain: float


def fit_noise(period_s: FloatArray, step_s: float = 0.0) -> NoiseFit | None:
    """Tell accumulating from edge noise in consecutive periods.

    Args:
        period_s: Periods in seconds, in order, shape (n,) with n >= 8.
        step_s: Grid on which the edges lie, 0 where they are interpolated.

    Returns:
        The fit, or None where the periods do not scatter.

    References:
        Fisher scoring of the likelihood over the sine transform, the degree of freedom of the
        mean taken out. Coverage is measured in tests/benchmarks/coverage_of_timing.py.
    """
    n = period_s.size
    mean_s = float(np.mean(period_s))
    wave = sine_transform(period_s - mean_s)
    ones = ones_transformed(n)
    spread = 2 - 2 * np.cos(np.pi * np.arange(1, n + 1) / (n + 1))
    least_q2 = step_s**2 / 12
    if not np.mean(wave**2) + least_q2 > (1e-12 * mean_s) ** 2:
        return None
    s2, u_s2, q2 = _variances(wave, ones, spread, least_q2)
    q2 = max(q2, _slow_edge_variance(period_s - mean_s, s2, q2))
    covariance = np.diag([u_s2**2, 4 * q2**2 / n])
    u_plain, dof_plain = _worth(np.array([1 / n, 2 / n**2]), np.array([s2, q2]), covariance)
    return NoiseFit(
        accumulating_s2=s2,
        edge_s2=q2,
        plain_s=mean_s,
        u_plain_s=u_plain,
        dof_plain=dof_plain,
    )


def sine_transform(values: FloatArray) -> FloatArray:
    """Return the orthonormal sine transform (type I) of values, shape (n,)."""
    n = values.size
    if n <= _DIRECT:
        k = np.arange(1, n + 1)
        sines = np.sin(np.pi / (n + 1) * np.outer(k, k)) * np.sqrt(2 / (n + 1))
        direct: FloatArray = sines @ values
        return direct
    odd = np.zeros(2 * (n + 1))
    odd[1 : n + 1] = values
    odd[n + 2 :] = -values[::-1]
    transform: FloatArray = -np.fft.rfft(odd)[1 : n + 1].imag / np.sqrt(2 * (n + 1))
    return transform


def ones_transformed(n: int) -> FloatArray:
    """Return the sine transform of n ones: cotangents at odd k, zero at even k."""
    k = np.arange(1, n + 1)
    cotangent = 1 / np.tan(np.pi * k / (2 * (n + 1)))
    ones: FloatArray = np.where(k % 2 == 1, cotangent, 0.0) * np.sqrt(2 / (n + 1))
    return ones


def _variances(
    wave: FloatArray, ones: FloatArray, spread: FloatArray, least_q2: float
) -> tuple[float, float, float]:
    """Return the accumulating variance, its standard uncertainty, and the edge variance.

    The edge variance comes from the upper half; of rounding only a part is expected in the
    lower half, from which the accumulating variance comes: errors that repeat even out.
    """
    lower, upper = slice(0, wave.size // 2), slice(wave.size // 2, None)
    s2 = u_s2 = float(np.mean(wave**2))
    q2, floor = least_q2, 1e-9 * s2
    for _ in range(_SCORING_STEPS):
        q2 = max(least_q2, float(np.mean((wave[upper] ** 2 - s2) / spread[upper])))
        expected = (q2 - (1 - _ROUNDING) * least_q2) * spread
        power = np.maximum(s2 + expected, floor)
        weight = ones / power
        total = weight @ ones
        shift, freedom = weight @ wave / total, 1 - ones * weight / total
        square = np.minimum((wave - shift * ones) ** 2, _FAR * power) / _KEPT
        own = (freedom / power**2)[lower]
        excess = ((square - expected * freedom) / power**2)[lower]
        moved = max(0.0, float(np.sum(excess) / np.sum(own)))
        u_s2 = float(np.sqrt(2 / np.sum(own)))
        if abs(moved - s2) <= 1e-6 * (s2 + u_s2):
            return moved, u_s2, q2
        s2 = moved
    return s2, u_s2, q2


def _slow_edge_variance(away_s: FloatArray, s2: float, q2: float) -> float:
    """Return the variance of edge errors that change slowly, such as rounding in a slow beat.

    It shows in the distance of edges m periods apart, as long as that is not the oscillator's.
    """
    edges = np.concatenate([[0.0], np.cumsum(away_s)])
    largest, m = 0.0, 1
    while m <= away_s.size // 4 and m * s2 <= 2 * q2:
        apart = edges[m:] - edges[:-m]
        largest = max(largest, float(np.mean(apart**2)) / 2 - m * s2 / 2)
        m *= 2
    return largest


def _worth(parts: FloatArray, variances: FloatArray, covariance: FloatArray) -> tuple[float, float]:
    """Return u and dof of a mean whose variance is ``parts @ variances``.

    References:
        dof = 2·u⁴/var(u²), JCGM 100:2008 E.7 and G.4.
    """
    u2 = float(parts @ variances)
    variance = float(parts @ covariance @ parts)
    dof = 2 * u2 * u2 / variance if variance > 0 else np.inf
    return float(np.sqrt(u2)), max(_LEAST_DOF, float(dof))
