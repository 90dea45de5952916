"""The lines of an uncertainty budget that the figures of a trace share."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.quantity import Contribution
from benchtool.model.timing import Edges, Intervals
from benchtool.timing.grid import (
    UNSEEN,
    blurred_width_floor,
    line_misfit,
    line_period,
    line_period_error,
    most_edge_noise,
    period_in_step,
    phase_lock,
    width_floor,
)
from benchtool.timing.noise import NoiseFit, fit_noise
from benchtool.timing.scatter import ENOUGH, Mean, mean_of_widths, mean_on_grid
from benchtool.units import format_value

_WELL_PLACED = 0.1
"""Share of a step below which an edge's grid error is no overestimate, so that n of them average
no better than √n."""

_WALK = 2.0  # variance of a walk from end to end over the square of what it adds to a misfit

FEW = 6
"""Intervals below which chance may hide the grid from their scatter."""


@frozen_record(eq=False)
class Setting:
    """What all figures of one trace share."""

    intervals: Intervals
    edges: Edges
    timebase_rel: float
    jitter_rel: float
    period_s: float | None
    noise: NoiseFit | None

    @property
    def grid_s(self) -> float:
        """Grid step that stands for what the grid leaves in each edge."""
        return self.edges.grid_s if self.edges.resolved else self.edges.step_s


def settle_budget(
    intervals: Intervals, edges: Edges, timebase_rel: float, jitter_rel: float
) -> Setting:
    """Return what all figures share: mean period and noise, besides what was assumed.

    Args:
        intervals: What was cut out of the trace.
        edges: Where its edges lie.
        timebase_rel: Half-width of the timebase error, relative.
        jitter_rel: Assumed jitter where one interval is all there is, relative half-width.
    """
    period_s = intervals.period_s
    return Setting(
        intervals=intervals,
        edges=edges,
        timebase_rel=timebase_rel,
        jitter_rel=jitter_rel,
        period_s=float(np.mean(period_s)) if period_s.size else None,
        noise=noise_of(period_s, edges),
    )


def noise_of(period_s: FloatArray, edges: Edges) -> NoiseFit | None:
    """Return the two noises of periods on a grid, None where too few or without scatter."""
    if period_s.size < ENOUGH or edges.resolved:
        return None
    return fit_noise(period_s, edges.step_s)


def width_grid(setting: Setting, n: int) -> float:
    """Return what the grid gives the mean of n widths, as a standard uncertainty in seconds."""
    edges = setting.edges
    if edges.resolved:
        by_chance = 1 / math.sqrt(n) if edges.grid_s < _WELL_PLACED * edges.step_s else 0.0
        locks = [
            max(
                by_chance,
                phase_lock(edges.times_s[edges.rising == state], edges.step_s, setting.period_s),
            )
            for state in (True, False)
        ]
        return edges.grid_s / math.sqrt(12) * math.hypot(*locks)
    if setting.period_s is None:
        return width_floor(edges.step_s, n, None)
    step_s = edges.step_s
    period_s, u_period_s = setting.period_s, step_s / n / math.sqrt(6)
    wander, edge = _noise_in_steps(setting)
    ticks = outer_ticks(setting)
    if ticks is not None and ticks.size > ENOUGH:
        shown = max(0.0, line_misfit(ticks) - 1.0)
        wander = min(wander, _WALK * shown**2 / ticks.size)
        edge = min(max(edge, (UNSEEN / ticks.size) ** 2), most_edge_noise(ticks))
        period = line_period(ticks)
        u_line_s = step_s * line_period_error(period, ticks.size - 1, wander, edge)
        period_s, u_period_s = period * step_s, min(u_period_s, u_line_s)
    noises = wander * step_s**2, edge * step_s**2
    blurred_s = blurred_width_floor(step_s, n, period_s, u_period_s, *noises)
    in_step_s = step_s * period_in_step(period_s / step_s, n)
    return max(blurred_s, width_floor(step_s, n, in_step_s, *noises)) if in_step_s else blurred_s


def _noise_in_steps(setting: Setting) -> tuple[float, float]:
    """Return accumulating and edge noise as variances in grid steps squared, rounding left out."""
    fit, step_s = setting.noise, setting.edges.step_s
    if fit is None:
        return 0.0, 0.0
    return fit.accumulating_s2 / step_s**2, max(0.0, fit.edge_s2 / step_s**2 - 1 / 12)


def outer_ticks(setting: Setting) -> FloatArray | None:
    """Return the edges between unbroken periods in grid steps, None where a gap breaks them."""
    period_s = setting.intervals.period_s
    if len(setting.intervals.chains) != 1 or setting.edges.resolved or setting.edges.step_s == 0:
        return None
    ticks: FloatArray = np.concatenate([[0.0], np.cumsum(period_s)]) / setting.edges.step_s
    return ticks


def with_floor(
    setting: Setting, own: list[Contribution], floor: float, n: int
) -> list[Contribution]:
    """Add the grid to the scatter, of several intervals only as far as scatter misses it.

    A few intervals on a grid can agree by chance, so there both are added. Where edges are
    interpolated the floor is a rough figure and, of a few, no surer than their scatter.

    Args:
        setting: What all figures share.
        own: The scatter of the figure, in its unit.
        floor: Standard uncertainty that the grid alone gives, in the same unit.
        n: Number of intervals, 1 or more.
    """
    few = n < FEW
    scatter = math.sqrt(sum(term.u**2 for term in own))
    added = n == 1 or (few and not setting.edges.resolved)
    missed = floor if added else math.sqrt(max(0.0, floor**2 - scatter**2))
    dof = n if few and not added else math.inf
    return [*own, grid_error(missed, dof)]


def mean_width(setting: Setting, values: FloatArray) -> tuple[float, list[Contribution]]:
    """Return the mean of two or more widths with its scatter and what the grid adds.

    Where edges lie on a grid and are many, the grid is taken out of their scatter: what is left
    of it in the mean follows from the period.

    Args:
        setting: What all figures share.
        values: Widths in order, seconds.
    """
    floor_s = width_grid(setting, values.size)
    if setting.edges.resolved or values.size < ENOUGH or setting.edges.step_s == 0:
        mean = mean_of_widths(values)
        return mean.value, with_floor(setting, [scatter_of(mean)], floor_s, values.size)
    mean = mean_on_grid(values, setting.edges.step_s, floor_s, most_scatter(setting))
    return mean.value, [scatter_of(mean), grid_error(floor_s)]


def most_scatter(setting: Setting) -> float:
    """Return the most that widths scatter by themselves if the edges on a grid are nearly exact.

    Args:
        setting: What all figures share.

    Returns:
        Seconds; infinite where gaps part the edges.
    """
    ticks, step_s = outer_ticks(setting), setting.edges.step_s
    if ticks is None or ticks.size < ENOUGH:
        return math.inf
    intervals = setting.intervals
    first_s = intervals.cycle_high_s if intervals.active == "high" else intervals.cycle_low_s
    ends = ticks[:-1] + first_s / step_s
    return step_s * math.sqrt(most_edge_noise(ticks) + most_edge_noise(ends))


def scatter_of(mean: Mean) -> Contribution:
    """Return the contribution of a mean's scatter."""
    return Contribution(source="scatter", u=mean.u, dof=mean.dof, note=mean.note)


def single_interval(setting: Setting, value: float) -> list[Contribution]:
    """Return what stands in for scatter where one interval is all there is."""
    jitter = Contribution(
        source="assumed jitter",
        u=value * setting.jitter_rel / math.sqrt(3),
        note=f"half-width {format_value(setting.jitter_rel, '1', 2)} of one interval, rectangular",
    )
    noise = Contribution(
        source="edge noise",
        u=math.sqrt(2) * usual_edge_noise(setting),
        note="noise over slew, two edges",
    )
    return [jitter, noise]


def usual_edge_noise(setting: Setting) -> float:
    """Return the rms standard uncertainty of an edge from noise over slew, in seconds."""
    u_s = setting.edges.u_s
    return float(np.sqrt(np.mean(u_s**2))) if u_s.size else 0.0


def scale_errors(setting: Setting, value: float) -> Iterator[Contribution]:
    """Return errors that stretch all times alike: they cancel in the duty."""
    yield Contribution(
        source="timebase",
        u=value * setting.timebase_rel / math.sqrt(3),
        common=True,
        note=f"half-width {format_value(setting.timebase_rel, '1', 2)}, rectangular",
    )
    yield Contribution(
        source="time stamps",
        u=value * setting.edges.stretch_u_rel,
        common=True,
        note="few digits of the times",
    )


def level_error(setting: Setting, factor: float = 1.0) -> Contribution:
    """Return what level and code step give t_high, times a sensitivity (-1 for t_low)."""
    return Contribution(
        source="level",
        u=factor * setting.edges.level_u_s,
        common=True,
        note="reference level and code step over the slew",
    )


def grid_error(u_s: float, dof: float = math.inf) -> Contribution:
    """Return the contribution of the sampling grid."""
    return Contribution(source="grid", u=u_s, dof=dof, note="sampling interval or tick")
