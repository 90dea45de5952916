"""Jitter: scatter of the periods, of neighbours, and the grid's share of it."""

from __future__ import annotations

import math

import numpy as np

from benchtool.model.arrays import FloatArray
from benchtool.model.quantity import Bound, Contribution, Measured, Notice, Quantity
from benchtool.model.timing import Edges, Intervals, Jitter
from benchtool.timing.rounding import own_deviation
from benchtool.timing.scatter import lag_one, two_pass_sd
from benchtool.uncertainty import combine

_LEAST = 3


def measure_jitter(intervals: Intervals, edges: Edges) -> Jitter:
    """Return the jitter of the periods, without figures for fewer than three of them.

    Args:
        intervals: Intervals of the trace.
        edges: The edges they were made of.

    Returns:
        Standard deviation, peak-to-peak and cycle-to-cycle figures in seconds. Where edges lie
        on a grid its share is taken out, or the figure is an upper bound.

    References:
        JESD65B as quoted in public notes: period jitter against the mean period, cycle-to-cycle
        jitter between adjacent periods (from memory of those notes).
    """
    period_s = intervals.period_s
    if period_s.size < _LEAST:
        return Jitter()
    grid_s = 0.0 if edges.resolved else edges.step_s
    steps_s = neighbour_steps(intervals)
    sd_s, rms_s = two_pass_sd(period_s), _rms(steps_s)
    period_sd = _without_grid(sd_s, period_s, grid_s, 1.0)
    cycle_rms = _without_grid(rms_s, period_s, grid_s, math.sqrt(3)) if steps_s.size else None
    mean_s = float(np.mean(period_s))
    return Jitter(
        period_sd=period_sd,
        period_pp=_spread(float(np.ptp(period_s)), period_s.size, grid_s),
        cycle_rms=cycle_rms,
        cycle_peak=_spread(float(np.max(np.abs(steps_s))), steps_s.size, grid_s)
        if steps_s.size
        else None,
        grid_share=combine(grid_share(grid_s, mean_s), "s", [], n=period_s.size),
        lag1=lag_one(period_s),
        warnings=_notices(period_sd, cycle_rms, grid_s),
    )


def neighbour_steps(intervals: Intervals) -> FloatArray:
    """Return the differences of periods that follow each other, in seconds, shape (m,)."""
    steps = [np.diff(intervals.period_s[start:stop]) for start, stop in intervals.chains]
    return np.concatenate(steps) if steps else np.empty(0)


def grid_share(grid_s: float, period_s: float) -> float:
    """Return the sd of periods that the grid alone gives, in seconds.

    References:
        A period of q + f steps reads q or q + 1 steps, with probabilities 1 - f and f.
    """
    if grid_s == 0:
        return 0.0
    f = period_s / grid_s - math.floor(period_s / grid_s)
    return grid_s * math.sqrt(f * (1 - f))


def _without_grid(seen_s: float, period_s: FloatArray, grid_s: float, factor: float) -> Quantity:
    """Return an sd with the grid's share taken out, or an upper bound where that is unsafe.

    ``factor`` is the sd of the figure's rounding error against that of a period: a difference of
    neighbouring periods has rounding errors 1, -2, 1.
    """
    n = period_s.size
    if grid_s == 0:
        return _deviation(seen_s, n)
    true_s = own_deviation(seen_s, float(np.mean(period_s)), grid_s) if factor == 1.0 else None
    if factor != 1.0:
        own2 = seen_s**2 - (factor * grid_s) ** 2 / 6
        true_s = math.sqrt(own2) if own2 > 0 else 0.0
    if true_s is None or true_s < grid_s:
        hidden_s = factor * grid_s / math.sqrt(6)  # where all edges fall alike, none of it is seen
        return Bound(unit="s", at_most=math.hypot(seen_s, hidden_s))
    return _deviation(true_s, n, stretch=seen_s / true_s)


def _deviation(value_s: float, n: int, stretch: float = 1.0) -> Measured:
    """Return a standard deviation with its uncertainty.

    References:
        Relative standard deviation of s: 1/√(2(n - 1)) (JCGM 100:2008, E.4.3).
    """
    u = value_s * stretch**2 / math.sqrt(2 * (n - 1))
    own = Contribution(source="scatter", u=u, dof=n - 1, note=f"sd of {n} values")
    return combine(value_s, "s", [own], n=n)


def _spread(value_s: float, n: int, grid_s: float) -> Measured:
    """Return an observed extreme: exact for the record but for the grid."""
    grid = Contribution(source="grid", u=grid_s / math.sqrt(3), note="two intervals")
    return combine(value_s, "s", [grid], n=n)


def _rms(values: FloatArray) -> float:
    return float(np.sqrt(np.mean(values**2))) if values.size else 0.0


def _notices(period_sd: Quantity, cycle_rms: Quantity | None, grid_s: float) -> tuple[Notice, ...]:
    if not (isinstance(period_sd, Bound) or isinstance(cycle_rms, Bound)):
        return ()
    text = f"the scatter is not well above the grid of {grid_s:.3g} s: only an upper bound is known"
    return (Notice(code="jitter-below-grid", text=text),)
