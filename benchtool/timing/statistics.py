"""The timing figures and their uncertainty budgets."""

from __future__ import annotations

import math

from benchtool.model.arrays import FloatArray
from benchtool.model.options import JITTER_REL, TIMEBASE_REL
from benchtool.model.quantity import Contribution, Measured
from benchtool.model.timing import Edges, Intervals, Timing
from benchtool.timing.bounds import bound_duration, bound_frequency, bound_period
from benchtool.timing.budget import (
    Setting,
    grid_error,
    level_error,
    noise_of,
    scale_errors,
    settle_budget,
    single_interval,
    width_grid,
    with_floor,
)
from benchtool.timing.drift import find_drift
from benchtool.timing.duty import measure_duty
from benchtool.timing.grid import period_floor
from benchtool.timing.noise import NoiseFit
from benchtool.timing.remarks import direction_notice, few_notice
from benchtool.timing.scatter import ENOUGH, Mean, mean_of_periods, mean_of_widths
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
    n_chains = len(intervals.chains) or 1
    period = _period(setting, intervals.period_s, n_chains, setting.noise)
    others_noise = noise_of(intervals.other_period_s, edges)
    other = _period(setting, intervals.other_period_s, n_chains, others_noise)
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
    value, own = float(values[0]), single_interval(setting, float(values[0]))
    if values.size > 1:
        value, own = _from_scatter(mean_of_widths(values))
    terms = [
        *with_floor(setting, own, width_grid(setting, values.size), values.size),
        level_error(setting, sign),
        *scale_errors(setting, value),
    ]
    return combine(value, "s", terms, n=values.size)


def _period(
    setting: Setting, values: FloatArray, n_chains: int, noise: NoiseFit | None
) -> Measured | None:
    if not values.size:
        return None
    resolved = setting.edges.resolved
    value, own = float(values[0]), single_interval(setting, float(values[0]))
    if values.size > 1:
        step_s = 0.0 if resolved else setting.edges.step_s
        value, own = _from_scatter(mean_of_periods(values, n_chains, step_s, noise))
    floor_s = period_floor(setting.grid_s, values.size, n_chains)
    if resolved and values.size >= ENOUGH:
        floor_s = 0.0
    terms = with_floor(setting, own, floor_s, values.size)
    return combine(value, "s", [*terms, *scale_errors(setting, value)], n=values.size)


def _from_scatter(mean: Mean) -> tuple[float, list[Contribution]]:
    scatter = Contribution(source="scatter", u=mean.u, dof=mean.dof, note=mean.note)
    return mean.value, [scatter]


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
