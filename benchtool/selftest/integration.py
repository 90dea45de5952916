"""Times of a circuit by integrating its node equation until the thresholds are crossed."""

from __future__ import annotations

import math

from benchtool.circuits import Circuit
from benchtool.frozen import frozen_record
from benchtool.selftest.kirchhoff import (
    Phase,
    charge_phases,
    closed_switch_v,
    discharge_phase,
)

_RTOL, _ATOL_V = 1e-12, 1e-13


@frozen_record
class _State:
    """Time in seconds, and volts inside the capacitor."""

    s: float
    v: float


def integrate_times(circuit: Circuit) -> dict[str, float]:
    """Return the times of a circuit that runs, by the names of ``Prediction``, seconds.

    Args:
        circuit: All floats. Series resistance and probe capacitance not both above 0: the node
            equation then has two states and this one has not.

    References:
        Kirchhoff's current law at the node, C·dv/dt = i(v), integrated by an explicit
        Runge-Kutta method of order 8 (scipy, DOP853) with events at the thresholds.
    """
    start_v = 0.0
    if circuit.topology == "one-shot":
        start_v = closed_switch_v(circuit, float(circuit.R))
    turned = _charge(circuit, _State(s=0.0, v=start_v))
    if circuit.topology == "power-on":
        return {"delay": turned.s}
    if circuit.topology == "one-shot":
        return {"t_high": turned.s}
    low = _discharge(circuit, turned)
    high = _charge(circuit, low)
    low_again = _discharge(circuit, high)
    t_high, t_low = high.s - low.s, low_again.s - high.s
    return {
        "first_high": turned.s,
        "t_high": t_high,
        "t_low": t_low,
        "period": t_high + t_low,
        "duty": t_high / (t_high + t_low),
    }


def _charge(circuit: Circuit, begin: _State) -> _State:
    """Go up through all connections to the upper threshold, and on for the delay."""
    upper, left_s, now = float(circuit.v_upper), float(circuit.delay_upper), begin
    crossed = False
    for phase in charge_phases(circuit):
        if not crossed:
            goal = min(upper, phase.until_v)
            now = _go(circuit, phase, now, goal)
            crossed = goal == upper
        if crossed:
            before = now.s
            now = _go(circuit, phase, now, phase.until_v, longest_s=left_s)
            left_s -= now.s - before
    return now


def _discharge(circuit: Circuit, begin: _State) -> _State:
    phase = discharge_phase(circuit)
    at_lower = _go(circuit, phase, begin, float(circuit.v_lower))
    return _go(circuit, phase, at_lower, math.inf, longest_s=float(circuit.delay_lower))


def _go(
    circuit: Circuit, phase: Phase, begin: _State, goal_v: float, *, longest_s: float | None = None
) -> _State:
    """Integrate until the node is at ``goal_v``, or for ``longest_s``.

    Raises:
        ArithmeticError: If the goal is never reached.
    """
    from scipy.integrate import solve_ivp

    if longest_s == 0:
        return begin
    farad = float(circuit.C) + float(circuit.probe_c)
    offset_a, slope_s = _line(phase)
    esr = float(circuit.esr)

    def node_v(inside_v: float) -> float:
        return (inside_v + esr * offset_a) / (1 - esr * slope_s)

    def short_v(_: float, state: list[float]) -> float:
        return goal_v - node_v(state[0]) if math.isfinite(goal_v) else 1.0

    rising = phase.current(node_v(begin.v)) > 0
    if math.isfinite(goal_v) and (short_v(0.0, [begin.v]) > 0) != rising:
        return begin
    short_v.terminal = True  # type: ignore[attr-defined]
    slowest_s = 60 * farad * (esr + abs(1 / slope_s))
    found = solve_ivp(
        lambda _, state: [phase.current(node_v(state[0])) / farad],
        (0.0, slowest_s if longest_s is None else longest_s),
        [begin.v],
        method="DOP853",
        rtol=_RTOL,
        atol=_ATOL_V,
        events=short_v,
    )
    if longest_s is None and not found.t_events[0].size:
        raise ArithmeticError(f"the node never reaches {goal_v} V")
    return _State(s=begin.s + float(found.t[-1]), v=float(found.y[0][-1]))


def _line(phase: Phase) -> tuple[float, float]:
    """Return offset (A) and slope (A/V) of the phase's current over the node's voltage."""
    at_zero = phase.current(0.0)
    return at_zero, phase.current(1.0) - at_zero
