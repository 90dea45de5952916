"""What rounding both edges to a grid does to the scatter of intervals."""

from __future__ import annotations

import math

_HARMONICS = 50


def observed_variance(sigma_s: float, period_s: float, grid_s: float) -> float:
    """Return the variance of periods on a grid whose true sd is ``sigma_s``, in s².

    Args:
        sigma_s: True standard deviation of the periods in seconds.
        period_s: Mean period in seconds.
        grid_s: Grid step Ts in seconds, above 0.

    References:
        s² = σ² + Ts²[1/6 - π⁻²·Σ_k cos(2πkf)·exp(-2π²k²σ²/Ts²)/k²], f = frac(T/Ts): two rounding
        errors of a uniformly placed edge, correlated through the fraction of the period.
    """
    f = period_s / grid_s
    total = 1 / 6
    for k in range(1, _HARMONICS + 1):
        damping = math.exp(-2 * (math.pi * k * sigma_s / grid_s) ** 2)
        total -= math.cos(2 * math.pi * k * f) * damping / (math.pi * k) ** 2
    return sigma_s**2 + grid_s**2 * max(0.0, total)


def own_deviation(seen_s: float, mean_s: float, grid_s: float) -> float | None:
    """Return the sd of intervals without what rounding to a grid adds, None where that is all.

    Args:
        seen_s: Their sd as seen.
        mean_s: Their mean.
        grid_s: Grid step, above 0.
    """
    if seen_s**2 <= observed_variance(0.0, mean_s, grid_s):
        return None
    low, high = 0.0, seen_s
    for _ in range(60):
        middle = (low + high) / 2
        if observed_variance(middle, mean_s, grid_s) < seen_s**2:
            low = middle
        else:
            high = middle
    return (low + high) / 2
