"""What a sampling grid does to intervals whose true length is known.

Measuring uses the same formulas with the length it found; here the true one is at hand.
"""

from __future__ import annotations

import math

import numpy as np

_HARMONICS = 30
_MOST_LAGS = 1 << 14
_LINES = 8
UNSEEN = 1.6
"""Noise of its own that an edge may have unseen among n others on the grid, times n, in steps."""

_PERIOD_ERROR = tuple((away / 3, (3 - abs(away)) / 9) for away in range(-2, 3))
"""A triangle of half-width 1 in five points: their places and shares."""


def rounded_variance(length_s: float, step_s: float, own_s: float) -> float:
    """Return the variance of intervals between edges that a grid holds, s².

    Args:
        length_s: True mean length.
        step_s: Grid step Ts; 0 for no grid.
        own_s: Standard deviation of the intervals themselves.

    References:
        s² = σ² + Ts²[1/6 - π⁻²·Σ_k cos(2πkf)·exp(-2π²k²σ²/Ts²)/k²], f = frac(t/Ts); without
        scatter Ts²·f·(1 - f).
    """
    if step_s == 0:
        return own_s**2
    f = math.modf(length_s / step_s)[0]
    ratio = own_s / step_s
    if ratio == 0:
        return step_s**2 * f * (1 - f)
    series = math.fsum(
        math.cos(2 * math.pi * k * f) * math.exp(-2 * (math.pi * k * ratio) ** 2) / k**2
        for k in range(1, _HARMONICS + 1)
    )
    return own_s**2 + step_s**2 * max(0.0, 1 / 6 - series / math.pi**2)


def mean_width_grid(period_s: float, n: int, step_s: float, own_s: float) -> float:
    """Return the standard uncertainty that the grid gives the mean of n widths, seconds.

    The period is as sure as n of them on the grid say: over that range edges may lie in step with
    the grid, where their errors do not even out. Nor do they where edges have noise of their own,
    of which measuring allows for as much as it could not see.

    Args:
        period_s: Spacing of the widths.
        n: How many, 1 or more.
        step_s: Grid step.
        own_s: Standard deviation of a period: it moves the edges off the grid.

    References:
        u² = Ts²[1/(6n) + (2/n²)·Σ_{m=1}^{n-1}(n - m)(d² - d + 1/6)], d = frac(m·T/Ts), where noise
        takes exp(-2π²k²·var/Ts²) of harmonic k of d² - d + 1/6 = π⁻²·Σ cos(2πkd)/k².
    """
    if n == 1 or step_s == 0:
        return step_s / math.sqrt(6 * n)
    half = 1 / n  # √6 times Ts/(n√6), in steps
    squares = (
        share * _mean_square(period_s / step_s + away * half, n, (own_s / step_s) ** 2)
        for away, share in _PERIOD_ERROR
    )
    return step_s * math.sqrt(math.fsum(squares))


def _mean_square(period: float, n: int, own: float) -> float:
    m = np.arange(1, min(n, _MOST_LAGS), dtype=np.float64)
    blur = 2 * math.pi**2 * (m * own + 2 * (UNSEEN / n) ** 2)
    related = np.zeros(m.size)
    for k in range(1, _LINES + 1):
        related += np.cos(2 * math.pi * k * m * period) * np.exp(-k * k * blur) / (math.pi * k) ** 2
    total = 1 / (6 * n) + 2 / n**2 * float(np.sum((n - m) * related))
    return max(total, 1 / (6 * n * n))
