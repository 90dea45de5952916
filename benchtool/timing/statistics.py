"""The timing figures and their uncertainty budgets."""

from __future__ import annotations

import math

from benchtool.model.arrays import FloatArray
from benchtool.model.options import JITTER_REL, TIMEBASE_REL
from benchtool.model.quantity import Measured
from benchtool.model.timing import Edges, Intervals, Timing
from benchtool.timing.bounds import bound_duration, bound_frequency, bound_period
from benchtool.timing.budget import (
    Setting,
    grid_error,
    level_error,
    mean_width,
    scale_errors,
    settle_budget,
    single_interval,
    width_grid,
    with_floor,
)
from benchtool.timing.drift import find_drift
from benchtool.timing.duty import measure_duty
from benchtool.timing.periods import measure_period, one_way_period
from benchtool.timing.remarks import direction_notice, few_notice
from benchtool.uncertainty import combine, propagate


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
    period = measure_period(setting)
    ways = [one_way_period(setting, x) for x in (intervals.period_s, intervals.other_period_s)]
    return Timing(
        t_high=t_high or bound_duration(intervals, "high"),
        t_low=t_low or bound_duration(intervals, "low"),
        period=period or bound_period(intervals),
        frequency=_frequency(period) or bound_frequency(intervals),
        duty=measure_duty(setting),
        first_high=_first_high(setting),
        drift=find_drift(intervals),
        warnings=(*few_notice(setting), *direction_notice(intervals, *ways)),
    )


def _width(setting: Setting, values: FloatArray, *, sign: float) -> Measured | None:
    """Return t_high (``sign`` 1) or t_low (-1): a level error moves them opposite ways."""
    if not values.size:
        return None
    value = float(values[0])
    if values.size > 1:
        value, own = mean_width(setting, values)
    else:
        own = with_floor(setting, single_interval(setting, value), width_grid(setting, 1), 1)
    terms = [*own, level_error(setting, sign), *scale_errors(setting, value)]
    return combine(value, "s", terms, n=values.size)


def _frequency(period: Measured | None) -> Measured | None:
    if period is None or period.value <= 0:  # 0 where all times round to one
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
