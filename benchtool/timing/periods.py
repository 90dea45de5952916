"""The period and its uncertainty budget."""

from __future__ import annotations

from benchtool.model.arrays import FloatArray
from benchtool.model.quantity import Contribution, Measured
from benchtool.timing.budget import (
    Setting,
    grid_error,
    outer_ticks,
    scale_errors,
    scatter_of,
    single_interval,
    usual_edge_noise,
    with_floor,
)
from benchtool.timing.grid import hidden_noise, period_floor
from benchtool.timing.scatter import (
    ENOUGH,
    ENOUGH_FOR_BOTH_WAYS,
    Mean,
    mean_of_both_ways,
    mean_of_periods,
    mean_of_widths,
)
from benchtool.uncertainty import combine, expanded

_LEAST_ON_A_LINE = 6  # periods; fewer come close to one by chance


def measure_period(setting: Setting) -> Measured | None:
    """Return the mean period, None where no period is complete.

    Args:
        setting: What all figures of the trace share.
    """
    values = setting.intervals.period_s
    if not values.size:
        return None
    if values.size == 1 or setting.edges.resolved:
        value, terms = _interpolated(setting, values)
        return combine(value, "s", [*terms, *scale_errors(setting, value)], n=values.size)
    scatter = mean_of_periods(values, _n_chains(setting), setting.noise)
    ways = [with_floor(setting, [scatter_of(scatter)], _floor(setting, values), values.size)]
    if values.size >= _LEAST_ON_A_LINE and not scatter.slow:
        ways += _on_a_line(setting, values.size)
    found = [
        combine(scatter.value, "s", [*terms, *scale_errors(setting, scatter.value)], n=values.size)
        for terms in ways
    ]
    return min(found, key=expanded)


def one_way_period(setting: Setting, values: FloatArray) -> Measured | None:
    """Return the mean of periods between edges of one direction, None of none.

    Args:
        setting: What all figures of the trace share.
        values: The periods in order, seconds.
    """
    if not values.size:
        return None
    own = single_interval(setting, float(values[0]))
    value = float(values[0])
    if values.size > 1:
        mean = mean_of_widths(values)
        value, own = mean.value, [scatter_of(mean)]
    terms = with_floor(setting, own, _floor(setting, values), values.size)
    return combine(value, "s", terms, n=values.size)


def _interpolated(setting: Setting, values: FloatArray) -> tuple[float, list[Contribution]]:
    """Return the period with scatter and grid, where edges lie between samples, or of one."""
    floor_s = _floor(setting, values)
    if values.size == 1:
        value = float(values[0])
        return value, with_floor(setting, single_interval(setting, value), floor_s, 1)
    mean = _mean(setting, values)
    if values.size >= ENOUGH:
        floor_s = 0.0
    return mean.value, with_floor(setting, [scatter_of(mean)], floor_s, values.size)


def _mean(setting: Setting, values: FloatArray) -> Mean:
    if values.size >= ENOUGH_FOR_BOTH_WAYS:
        return mean_of_both_ways(setting.intervals, usual_edge_noise(setting))
    return mean_of_widths(values)


def _on_a_line(setting: Setting, n: int) -> list[list[Contribution]]:
    """Return the budget that follows from how well all edges fit one line on the grid."""
    ticks = outer_ticks(setting)
    if ticks is None:
        return []
    step_s = setting.edges.step_s
    note = f"left open by edges that fit one line on the grid, over {n}"
    noise = Contribution(source="scatter", u=hidden_noise(ticks) * step_s / n, note=note)
    return [[noise, grid_error(period_floor(step_s, n))]]


def _floor(setting: Setting, values: FloatArray) -> float:
    return period_floor(setting.grid_s, values.size, _n_chains(setting))


def _n_chains(setting: Setting) -> int:
    return len(setting.intervals.chains) or 1
