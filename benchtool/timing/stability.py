"""Frequency stability over averaging times: the overlapping Allan deviation."""

from __future__ import annotations

import math

import numpy as np

from benchtool.model.arrays import FloatArray
from benchtool.model.timing import Intervals, StabilityPoint
from benchtool.uncertainty import COVERAGE, chi_square_quantile, whole_dof

_LEAST = 3


def overlapping_adev(phase: FloatArray, tau0: float, m: int) -> float:
    """Return the overlapping Allan deviation at the averaging time ``m*tau0``.

    Args:
        phase: Time errors in seconds at even spacing, shape (n,), n > 2m.
        tau0: Spacing in seconds.
        m: Averaging factor, at least 1.

    References:
        NIST SP 1065 (2008), equation (11), page 16.
    """
    second = phase[2 * m :] - 2 * phase[m:-m] + phase[: -2 * m]
    return math.sqrt(float(second @ second) / (2 * second.size)) / (m * tau0)


def degrees_of_freedom(n: int, m: int) -> float:
    """Return the equivalent degrees of freedom of the overlapping Allan variance.

    The white-frequency case is taken, which is an oscillator whose timing noise accumulates.

    Args:
        n: Number of phase points.
        m: Averaging factor.

    References:
        NIST SP 1065 (2008), table 5 "edf approximations", white FM:
        [3(n-1)/(2m) - 2(n-2)/n]·4m²/(4m²+5) (table number from memory).
    """
    edf = (3 * (n - 1) / (2 * m) - 2 * (n - 2) / n) * 4 * m * m / (4 * m * m + 5)
    return max(1.0, edf)


def measure_stability(intervals: Intervals) -> tuple[StabilityPoint, ...]:
    """Return the overlapping Allan deviation of the period at octave averaging times.

    Args:
        intervals: Intervals of the trace; the longest unbroken succession is used.

    Returns:
        Points with their 95 % interval; none for fewer than three periods.
    """
    start, stop = max(intervals.chains, key=lambda c: c[1] - c[0], default=(0, 0))
    period_s = intervals.period_s[start:stop]
    if period_s.size < _LEAST:
        return ()
    tau0 = float(np.mean(period_s))
    phase = np.concatenate([[0.0], np.cumsum(period_s - tau0)])
    points: list[StabilityPoint] = []
    m = 1
    while 2 * m < phase.size:
        points.append(_point(phase, tau0, m))
        m *= 2
    return tuple(points)


def _point(phase: FloatArray, tau0: float, m: int) -> StabilityPoint:
    adev, edf = overlapping_adev(phase, tau0, m), degrees_of_freedom(phase.size, m)
    high, low = (chi_square_quantile(p, edf) for p in ((1 - COVERAGE) / 2, (1 + COVERAGE) / 2))
    return StabilityPoint(
        tau_s=m * tau0,
        adev=adev,
        lower=adev * math.sqrt(whole_dof(edf) / low),
        upper=adev * math.sqrt(whole_dof(edf) / high),
        n=phase.size - 2 * m,
    )
