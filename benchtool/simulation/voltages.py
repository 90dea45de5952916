"""Volts of each trace at given times: band-limited steps, the node, the ripple."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np

from benchtool.circuits import Circuit, find_family, find_topology
from benchtool.model.arrays import FloatArray
from benchtool.model.capture import Role
from benchtool.simulation.course import Course


def output_levels(circuit: Circuit) -> tuple[float, float]:
    """Return low and high level of the output without load, volts.

    Where the topology does not time with its output, the drop is that of the IC's family.
    """
    drop_v = float(circuit.output_high_drop)
    if "output_high_drop" not in find_topology(circuit.topology).ic_terms and circuit.family:
        supply_v = float(circuit.supply)
        drop_v = float(find_family(circuit.family).terms["output_high_drop"].at(supply_v))
    return float(circuit.output_low), float(circuit.supply) - drop_v


def filter_steps(
    steps_s: FloatArray,
    levels_v: FloatArray,
    start_v: float,
    times_s: FloatArray,
    bandwidth_hz: float | None,
) -> FloatArray:
    """Return a row of steps as a one-pole low-pass shows it.

    Args:
        steps_s: When the level changes, ascending, shape (n,).
        levels_v: Level after each change, shape (n,).
        start_v: Level before the first, settled.
        times_s: Where to evaluate, shape (m,).
        bandwidth_hz: Corner frequency; None leaves the steps square.

    Returns:
        Volts, shape (m,).

    References:
        y(t) = x + (y0 - x)·e^(-(t - t0)/tau) after a step to x at t0, tau = 1/(2π·bandwidth).
    """
    step = np.searchsorted(steps_s, times_s, side="right")
    levels = np.concatenate(([start_v], levels_v))
    if bandwidth_hz is None or steps_s.size == 0:
        square: FloatArray = levels[step]
        return square
    tau_s = 1 / (2 * math.pi * bandwidth_hz)
    begun_s = np.concatenate(([-math.inf], steps_s))
    shown = _shown_at_steps(steps_s, levels, tau_s)
    with np.errstate(under="ignore"):
        decay = np.exp(-(times_s - begun_s[step]) / tau_s)
    filtered: FloatArray = levels[step] + (shown[step] - levels[step]) * decay
    return filtered


def _shown_at_steps(steps_s: FloatArray, levels: FloatArray, tau_s: float) -> FloatArray:
    """Return what the low-pass shows at each step, the first entry being the start."""
    shown = np.empty_like(levels)
    shown[0] = levels[0]
    before_s, now_v = -math.inf, float(levels[0])
    for index, step_s in enumerate(steps_s):
        held = float(levels[index])
        now_v = held + (now_v - held) * math.exp(-(float(step_s) - before_s) / tau_s)
        shown[index + 1] = now_v
        before_s = float(step_s)
    return shown


def role_voltage(
    role: Role,
    course: Course,
    times_s: FloatArray,
    bandwidth_hz: float | None,
) -> FloatArray:
    """Return the volts of one trace at true times, shape as ``times_s``.

    A ripple rides on the supply and on what hangs on it: the high output and the trigger's rest.
    """
    return _SHOWN[role](course, times_s, bandwidth_hz)


def _output(course: Course, times_s: FloatArray, bandwidth_hz: float | None) -> FloatArray:
    low_v, high_v = output_levels(course.circuit)
    steps_s, levels_v = course.edges_s, np.where(course.edge_high, high_v, low_v)
    start_v = high_v if course.starts_high else low_v
    if math.isfinite(course.powered_s):
        start_v = 0.0
        after = steps_s > course.powered_s
        now_v = high_v if _state_at(course, course.powered_s) else low_v
        steps_s = np.concatenate(([course.powered_s], steps_s[after]))
        levels_v = np.concatenate(([now_v], levels_v[after]))
    shown = filter_steps(steps_s, levels_v, start_v, times_s, bandwidth_hz)
    share = (shown - low_v) / (high_v - low_v)
    return shown + np.clip(share, 0.0, 1.0) * _ripple_v(course, times_s)


def _state_at(course: Course, time_s: float) -> bool:
    """Return the output's state just after ``time_s``."""
    index = int(np.searchsorted(course.edges_s, time_s, side="right"))
    return bool(course.edge_high[index - 1]) if index else course.starts_high


def _node(course: Course, times_s: FloatArray, __: float | None) -> FloatArray:
    return course.legs.node_v(times_s, course.wave if course.wave.depth_rel else None)


def _supply(course: Course, times_s: FloatArray, bandwidth_hz: float | None) -> FloatArray:
    supply_v = float(course.circuit.supply)
    if math.isinf(course.powered_s):
        return np.full(times_s.shape, supply_v) + _ripple_v(course, times_s)
    shown = filter_steps(
        np.array([course.powered_s]), np.array([supply_v]), 0.0, times_s, bandwidth_hz
    )
    return shown + shown / supply_v * _ripple_v(course, times_s)


def _trigger(course: Course, times_s: FloatArray, bandwidth_hz: float | None) -> FloatArray:
    supply_v = float(course.circuit.supply)
    begins_s = course.triggers_s
    steps_s = np.column_stack((begins_s, begins_s + course.trigger_width_s)).ravel()
    levels_v = np.tile([0.0, supply_v], begins_s.size)
    shown = filter_steps(steps_s, levels_v, supply_v, times_s, bandwidth_hz)
    return shown + shown / supply_v * _ripple_v(course, times_s)


def _ripple_v(course: Course, times_s: FloatArray) -> FloatArray | float:
    if course.wave.depth_rel == 0:
        return 0.0
    return float(course.circuit.supply) * course.wave.depth_rel * course.wave.at(times_s)


_SHOWN: dict[Role, Callable[[Course, FloatArray, float | None], FloatArray]] = {
    "output": _output,
    "capacitor": _node,
    "supply": _supply,
    "trigger": _trigger,
}
