"""What the sampling grid alone does to the mean of intervals."""

from __future__ import annotations

import math

import numpy as np

from benchtool.model.arrays import FloatArray

_HARMONICS = 6
_MOST_LAGS = 1 << 20
_PERIOD_ERROR = tuple((away / 3, (3 - abs(away)) / 9) for away in range(-2, 3))
"""A triangle of half-width 1 in five points: their places and shares."""


def period_floor(step_s: float, n: int, n_chains: int = 1) -> float:
    """Return the standard uncertainty that the grid gives the mean of n periods, in seconds.

    Only the first and the last edge of each succession count: Ts·√chains/(n√6).

    Args:
        step_s: Grid step Ts in seconds.
        n: Number of periods, 1 or more.
        n_chains: Number of successions without a gap, 1 or more.
    """
    return step_s * math.sqrt(n_chains) / (n * math.sqrt(6))


def width_floor(
    step_s: float, n: int, period_s: float | None, jitter_s2: float = 0.0, edge_s2: float = 0.0
) -> float:
    """Return the standard uncertainty that the grid gives the mean of n widths, in seconds.

    Args:
        step_s: Grid step Ts in seconds.
        n: Number of widths.
        period_s: Their spacing in seconds, None where unknown (then as if independent).
        jitter_s2: Variance a period of accumulating noise, s²; it moves edges off the grid.
        edge_s2: Variance of an edge's own noise, s².

    References:
        u² = Ts²[1/(6n) + (2/n²)·Σ_{m=1}^{n-1}(n-m)(d² - d + 1/6)], d = frac(m·T/Ts): the
        covariance of rounding errors m periods apart. With noise, harmonic k of
        d² - d + 1/6 = π⁻²·Σ cos(2πkd)/k² shrinks by exp(-2π²k²·var/Ts²).
    """
    if step_s == 0 or n == 0:
        return 0.0
    if period_s is None or n == 1:
        return step_s / math.sqrt(6 * n)
    m = np.arange(1, min(n, _MOST_LAGS), dtype=np.float64)
    related = rounding_covariance(
        m * (period_s / step_s), (m * jitter_s2 + 2 * edge_s2) / step_s**2
    )
    total = 1 / (6 * n) + 2 / n**2 * float(np.sum((n - m) * related))
    return step_s * math.sqrt(max(total, 1 / (6 * n * n)))


def blurred_width_floor(
    step_s: float, n: int, period_s: float, jitter_s2: float = 0.0, edge_s2: float = 0.0
) -> float:
    """Return ``width_floor`` where the period itself was measured on the grid, in seconds.

    Its error, as large as Ts/n, hides whether the edges lie in step with the grid, where u is far
    larger: the mean square over a triangle of that half-width. (The largest over it would need no
    chance at all, and be twice what 95 % of errors need.)

    Args:
        step_s: As for ``width_floor``, and so are the others.
        n: Number of widths.
        period_s: Their spacing as measured.
        jitter_s2: Variance a period of accumulating noise.
        edge_s2: Variance of an edge's own noise.
    """
    squares = (
        share * width_floor(step_s, n, period_s + away * step_s / n, jitter_s2, edge_s2) ** 2
        for away, share in _PERIOD_ERROR
    )
    return math.sqrt(math.fsum(squares))


def rounding_covariance(cycles: FloatArray, variance: FloatArray) -> FloatArray:
    """Return d² - d + 1/6 of the fraction d of ``cycles``, smoothed by noise.

    Args:
        cycles: Distance of two edges in grid steps, shape (n,).
        variance: Variance of that distance in steps squared, shape (n,).
    """
    if not variance.any():
        d = cycles - np.floor(cycles)
        exact: FloatArray = d * d - d + 1 / 6
        return exact
    smooth = np.zeros(cycles.size)
    for k in range(1, _HARMONICS + 1):
        damping = np.exp(-2 * math.pi**2 * k**2 * variance)
        smooth += np.cos(2 * math.pi * k * cycles) * damping / (math.pi * k) ** 2
    return smooth


def phase_lock(times_s: FloatArray, step_s: float, period_s: float | None) -> float:
    """Return how far edges sit at one phase of the grid: 0 spread evenly, 1 all alike.

    Interpolation itself bends the phases it gives, and noise spreads those of an even beat, so
    edges are locked only as far as both their times and their mean period say so.

    Args:
        times_s: Edge times in seconds, shape (n,).
        step_s: Grid step in seconds.
        period_s: Mean period in seconds, None where unknown.
    """
    n = times_s.size
    if n < 6 or step_s == 0:
        return 1.0
    seen = _alike(times_s / step_s)
    if period_s is None:
        return seen
    even = np.arange(n, dtype=np.float64) * (period_s / step_s)
    return min(seen, _alike(even))


def _alike(cycles: FloatArray) -> float:
    """Return the length of the mean unit vector at these phases, chance taken out."""
    n = cycles.size
    angle = 2 * math.pi * cycles
    square = float(np.mean(np.cos(angle)) ** 2 + np.mean(np.sin(angle)) ** 2)
    return math.sqrt(max(0.0, (square - 1 / n) * n / (n - 1)))
