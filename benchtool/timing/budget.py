"""The lines of an uncertainty budget that the figures of a trace share."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.quantity import Contribution
from benchtool.model.timing import Edges, Intervals
from benchtool.timing.grid import blurred_width_floor, phase_lock, width_floor
from benchtool.timing.noise import NoiseFit, fit_noise
from benchtool.timing.scatter import ENOUGH
from benchtool.units import format_value

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
    """Return the two noises of periods, None where they are too few or do not scatter."""
    if period_s.size < ENOUGH:
        return None
    return fit_noise(period_s, 0.0 if edges.resolved else edges.step_s)


def width_grid(setting: Setting, n: int) -> float:
    """Return what the grid gives the mean of n widths, as a standard uncertainty in seconds."""
    edges = setting.edges
    if not edges.resolved:
        fit = setting.noise
        wander_s2 = fit.accumulating_s2 if fit else 0.0
        edge_s2 = max(0.0, fit.edge_s2 - edges.step_s**2 / 12) if fit else 0.0
        if setting.period_s is None:
            return width_floor(edges.step_s, n, None)
        return blurred_width_floor(edges.step_s, n, setting.period_s, wander_s2, edge_s2)
    locks = [
        phase_lock(edges.times_s[edges.rising == state], edges.step_s, setting.period_s)
        for state in (True, False)
    ]
    return edges.grid_s / math.sqrt(12) * math.hypot(*locks)


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
