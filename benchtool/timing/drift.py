"""A steady change of the period over the record."""

from __future__ import annotations

import math

from benchtool.model.quantity import Contribution, Measured
from benchtool.model.timing import Intervals
from benchtool.uncertainty import combine

_LEAST_PERIODS = 10
_SIGNIFICANT = 4.0  # standard uncertainties: one false alarm in ten thousand records


def find_drift(intervals: Intervals) -> Measured | None:
    """Return the relative drift of the period in 1/s, where a straight trend stands out.

    Args:
        intervals: Intervals of the trace; at least ten periods are needed.

    References:
        Straight-line least squares; standard error of the slope from the residuals, n - 2
        degrees of freedom (GUM H.3).
    """
    period_s, at_s = intervals.period_s, intervals.period_starts_s
    if period_s.size < _LEAST_PERIODS:
        return None
    x, y = at_s - at_s.mean(), period_s - period_s.mean()
    square = float(x @ x)
    if square == 0:
        return None
    slope = float(x @ y) / square
    residual = y - slope * x
    dof = period_s.size - 2
    u = math.sqrt(float(residual @ residual) / dof / square)
    if abs(slope) <= _SIGNIFICANT * u:
        return None
    mean_s = float(period_s.mean())
    trend = Contribution(source="trend", u=u / mean_s, dof=dof, note="residuals of a line")
    return combine(slope / mean_s, "1/s", [trend], n=period_s.size)
