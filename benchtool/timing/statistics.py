"""The timing figures and their uncertainty budgets."""

from __future__ import annotations

import math

from benchtool.model.capture import FloatArray
from benchtool.model.quantity import Contribution, Measured
from benchtool.model.timing import Edges, Intervals, Timing
from benchtool.timing.bounds import bound_duration, bound_frequency, bound_period
from benchtool.timing.budget import (
    Setting,
    grid_error,
    level_error,
    scale_errors,
    settle_budget,
    single_interval,
    width_grid,
    with_floor,
)
from benchtool.timing.drift import find_drift
from benchtool.timing.duty import measure_duty
from benchtool.timing.grid import period_floor
from benchtool.timing.remarks import direction_notice, few_notice
from benchtool.timing.scatter import ENOUGH, mean_of_periods, mean_of_widths
from benchtool.uncertainty import combine, propagate

TIMEBASE_REL = 50e-6
JITTER_REL = 1e-3


def measure_timing(
    intervals: Intervals,
    edges: Edges,
    *,
    timebase_rel: float = TIMEBASE_REL,
    jitter_rel: float = JITTER_REL,
) -> Timing:
    """Return the timing figures with their uncertainties, or bounds where nothing is complete.

    Args:
        intervals: Intervals of the trace.
        edges: The edges they were made of.
        timebase_rel: Half-width of the timebase error, relative (rectangular).
        jitter_rel: Half-width of the jitter assumed of a single interval, relative.

    Returns:
        Times in seconds, frequency in hertz, duty with unit 1. Never raises.

    References:
        JCGM 100:2008, 4.2 (type A), 4.3.7 (rectangular), G.4 (effective degrees of freedom).
    """
    setting = settle_budget(intervals, edges, timebase_rel, jitter_rel)
    t_high = _width(setting, intervals.high_s, sign=1.0)
    t_low = _width(setting, intervals.low_s, sign=-1.0)
    period = _period(setting, intervals.period_s, len(intervals.chains))
    other = _period(setting, intervals.other_period_s, len(intervals.chains) or 1)
    return Timing(
        t_high=t_high or bound_duration(intervals, "high"),
        t_low=t_low or bound_duration(intervals, "low"),
        period=period or bound_period(intervals),
        frequency=_frequency(period) or bound_frequency(intervals),
        duty=measure_duty(setting),
        first_high=_first_high(setting),
        drift=find_drift(intervals),
        warnings=(*few_notice(setting), *direction_notice(intervals, period, other)),
    )


def _width(setting: Setting, values: FloatArray, *, sign: float) -> Measured | None:
    """Return t_high (``sign`` 1) or t_low (-1): a level error moves them opposite ways."""
    if not values.size:
        return None
    own, value = _type_a(setting, values)
    floor_s = width_grid(setting, values.size)
    terms = [
        *with_floor(setting, own, floor_s, values.size),
        level_error(setting, sign),
        *scale_errors(setting, value),
    ]
    return combine(value, "s", terms, n=values.size)


def _period(setting: Setting, values: FloatArray, n_chains: int) -> Measured | None:
    if not values.size:
        return None
    own, value = _type_a(setting, values, n_chains=n_chains)
    floor_s = period_floor(setting.grid_s, values.size, n_chains)
    if setting.edges.resolved and values.size >= ENOUGH:
        floor_s = 0.0
    terms = with_floor(setting, own, floor_s, values.size)
    return combine(value, "s", [*terms, *scale_errors(setting, value)], n=values.size)


def _type_a(
    setting: Setting, values: FloatArray, *, n_chains: int | None = None
) -> tuple[list[Contribution], float]:
    """Return what scatter says, or for a single interval what has to be assumed."""
    if values.size == 1:
        value = float(values[0])
        return single_interval(setting, value), value
    if n_chains is None:
        mean = mean_of_widths(values)
    else:
        mean = mean_of_periods(values, n_chains, _unresolved_step(setting))
    return [Contribution(source="scatter", u=mean.u, dof=mean.dof, note=mean.note)], mean.value


def _unresolved_step(setting: Setting) -> float:
    return 0.0 if setting.edges.resolved else setting.edges.step_s


def _frequency(period: Measured | None) -> Measured | None:
    if period is None:
        return None
    return propagate(1 / period.value, "Hz", [(-1 / period.value**2, period)])


def _first_high(setting: Setting) -> Measured | None:
    value = setting.intervals.first_high_s
    if value is None:
        return None
    terms = [
        *single_interval(setting, value),
        grid_error(setting.grid_s / math.sqrt(6)),
        level_error(setting),
        *scale_errors(setting, value),
    ]
    return combine(value, "s", terms)
