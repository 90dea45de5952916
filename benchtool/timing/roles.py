"""Which trace of a capture is what, found by its shape."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from benchtool.errors import MeasurementError
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, middle
from benchtool.model.capture import Capture, LogicTrace, Role, Trace
from benchtool.model.timing import Edges, Levels
from benchtool.timing.edges import find_edges, find_levels_and_edges

_SUPPLY_SWING = 0.3  # a supply moves by less than this share of its mean
_LEAST_SUPPLY_V = 1.0
_SLOW = 0.4  # share of a state that its ramp takes at a capacitor node
_NARROW = 0.25  # a trigger pulse is shorter than this share of the pulse that it starts
_PRECEDED = 0.8


@frozen_record(eq=False)
class Shape:
    """What a trace looks like, by which its role is found and from which it is measured.

    Attributes:
        trace: The trace.
        levels: Its levels; None for a logic trace and for one without a sample.
        edges: Its edges, none of a flat one; None of a capacitor node, whose turning points are
            found when it is measured, and without levels.
    """

    trace: Trace
    levels: Levels | None
    edges: Edges | None

    @property
    def comes_up_s(self) -> float | None:
        """When the trace rises, where that is all it does; None elsewhere."""
        edges = self.edges
        if edges is None or edges.times_s.size != 1 or not edges.rising[0]:
            return None
        return float(edges.times_s[0])


def find_shapes(capture: Capture) -> tuple[Shape, ...]:
    """Return the shape of each trace of a capture, in order; each trace is walked."""
    return tuple(_shape(trace) for trace in capture.traces)


def find_roles(shapes: Sequence[Shape]) -> tuple[Role, ...]:
    """Return the role of each trace of a capture, in order.

    A supply is near flat and positive; a capacitor node spends its time between its turning
    points; a trigger's pulses are narrow and one comes before each pulse of an output; a trace
    that rises once, before all else, and stays is the supply coming up. A trace alone is the
    output, or the capacitor node.

    Args:
        shapes: Shape of each trace.
    """
    roles = [_own_role(shape) for shape in shapes]
    outputs = [i for i, role in enumerate(roles) if role == "output"]
    pulses = {i: _pulses(shapes[i]) for i in outputs}
    for i in outputs:
        if any(_triggers(pulses[i], pulses[j]) for j in outputs if j != i):
            roles[i] = "trigger"
        elif any(_comes_up_before(shapes[i], shapes[j]) for j in outputs if j != i):
            roles[i] = "supply"
    if "output" not in roles:
        _promote(shapes, roles)
    return tuple(roles)


def _shape(trace: Trace) -> Shape:
    if isinstance(trace, LogicTrace):
        return Shape(trace=trace, levels=None, edges=find_edges(trace))
    try:
        levels, edges = find_levels_and_edges(trace)
    except MeasurementError:
        return Shape(trace=trace, levels=None, edges=None)
    return Shape(trace=trace, levels=levels, edges=edges)


def _own_role(shape: Shape) -> Role:
    """Return what a trace is when looked at alone."""
    levels, edges = shape.levels, shape.edges
    if levels is None:
        return "output" if edges is not None and edges.times_s.size else "other"
    if levels.kind == "node":
        return "supply" if _is_supply(levels) else "capacitor"
    if levels.kind == "two-state":
        if _is_supply(levels):
            return "supply"
        if edges is not None and _is_ramp(levels, edges):
            return "capacitor"
        return "output" if edges is not None and edges.times_s.size else "other"
    return "supply" if levels.kind == "flat" and _is_supply(levels) else "other"


def _is_supply(levels: Levels) -> bool:
    mean = (levels.low_v + levels.high_v) / 2
    return mean > _LEAST_SUPPLY_V and levels.high_v - levels.low_v < _SUPPLY_SWING * mean


def _is_ramp(levels: Levels, edges: Edges) -> bool:
    """Tell a node that rests between its ramps: a ramp takes much of the time in its state.

    ``level_u_s`` is the level's error over both slopes, so the slopes follow from it.
    """
    u_mid_v = np.hypot(levels.u_low_v, levels.u_high_v) / 2
    if edges.times_s.size < 3 or u_mid_v == 0 or edges.level_u_s == 0:
        return False
    ramps_s = edges.level_u_s / u_mid_v * (levels.high_v - levels.low_v)
    shortest_s = float(middle(np.minimum(np.diff(edges.times_s)[:-1], np.diff(edges.times_s)[1:])))
    return bool(ramps_s > _SLOW * 2 * shortest_s)


def _comes_up_before(supply: Shape, other: Shape) -> bool:
    """Tell whether a trace rises once and stays, no later than anything happens on another."""
    up_s, ups, edges = supply.comes_up_s, supply.edges, other.edges
    if up_s is None or ups is None or edges is None or edges.times_s.size == 0:
        return False
    return bool(up_s <= edges.times_s[0] + 2 * max(ups.step_s, edges.step_s))


@frozen_record(eq=False)
class _Pulses:
    """The intervals of one state: when they begin, and how long they usually are."""

    starts_s: FloatArray
    width_s: float


def _triggers(trigger: list[_Pulses], output: list[_Pulses]) -> bool:
    """Tell whether each pulse of one trace begins with a narrow pulse of another."""
    narrow = min(trigger, key=lambda pulse: pulse.width_s, default=None)
    return narrow is not None and any(_starts(narrow, answer) for answer in output)


def _pulses(shape: Shape) -> list[_Pulses]:
    edges = shape.edges
    if edges is None or edges.times_s.size < 2:
        return []
    width_s = np.diff(edges.times_s)
    return [
        _Pulses(
            starts_s=edges.times_s[edges.rising == state],
            width_s=middle(width_s[edges.rising[:-1] == state]),
        )
        for state in (True, False)
        if np.any(edges.rising[:-1] == state)
    ]


def _starts(pulses: _Pulses, answers: _Pulses) -> bool:
    """Tell whether nearly each answer begins with a narrow pulse."""
    if pulses.width_s > _NARROW * answers.width_s:
        return False
    before = np.searchsorted(pulses.starts_s, answers.starts_s + pulses.width_s / 2, side="right")
    known = before > 0
    if not known.any():
        return False
    late_s = np.abs(answers.starts_s[known] - pulses.starts_s[before[known] - 1])
    limit_s = max(pulses.width_s, 0.02 * answers.width_s)
    return bool(np.mean(late_s <= limit_s) >= _PRECEDED)


def _promote(shapes: Sequence[Shape], roles: list[Role]) -> None:
    """Choose an output where nothing swings: the only trace, or the lowest of several flat."""
    if len(shapes) == 1:
        if roles[0] != "capacitor":
            roles[0] = "output"
        return
    flat = [
        i
        for i, role in enumerate(roles)
        if role in ("supply", "other") and _level(shapes[i]) is not None
    ]
    if len(flat) > 1 and "capacitor" not in roles:
        lowest = min(flat, key=lambda i: _level(shapes[i]) or 0.0)
        roles[lowest] = "output"


def _level(shape: Shape) -> float | None:
    return shape.levels.low_v if shape.levels is not None else None
