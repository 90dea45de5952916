"""The timing node by Kirchhoff's current law, integrated: the truth for the closed forms.

Nothing here comes from the circuit room but the record that holds the figures. At every instant the
node voltages follow from summing currents; the capacitor's voltage is integrated; comparators act
on the node and the drive turns after their delay.
"""

from __future__ import annotations

import math
from collections.abc import Callable

from scipy.integrate import solve_ivp

from benchtool.circuits import Circuit

REL, ABS = 1e-11, 1e-13


def outflow(c: Circuit, v: float) -> float:
    """Currents that leave the node other than into the capacitor, without the drive."""
    leaks = v / c.probe_r + v / c.shunt_ohm + (v - c.leak_to_v) / c.leak_ohm
    return leaks + c.i_bias + c.i_leak


def astable_inflow(c: Circuit, v: float, *, charging: bool) -> float:
    """Current through RB into the node, the discharge pin's own node eliminated."""
    if charging:  # (V - vd)/RA = I_DIS + (vd - v)/RB
        vd = (c.supply / c.RA - c.i_discharge_leak + v / c.RB) / (1 / c.RA + 1 / c.RB)
    elif c.r_on == 0:
        vd = c.v_sat
    else:  # (V - vd)/RA + (v - vd)/RB = (vd - Vsat)/Ron
        total = 1 / c.RA + 1 / c.RB + 1 / c.r_on
        vd = (c.supply / c.RA + v / c.RB + c.v_sat / c.r_on) / total
    return (vd - v) / c.RB


def diode_inflow(c: Circuit, v: float, *, charging: bool) -> float:
    """As the astable; the steering diode conducts where it would see more than its drop."""
    if c.series_diode_drop is not None:
        if charging:
            return (c.supply - v - c.diode_drop) / c.RA - c.i_discharge_leak
        return astable_inflow(c, v - c.series_diode_drop, charging=False)
    through_rb = astable_inflow(c, v, charging=charging)
    if charging and through_rb * c.RB > c.diode_drop:
        return (c.supply - v - c.diode_drop) / c.RA - c.i_discharge_leak
    return through_rb


def output_inflow(c: Circuit, v: float, *, charging: bool) -> float:
    if charging:
        return (c.supply - c.output_high_drop - v) / (c.R + c.output_high_resistance)
    return (c.output_low - v) / (c.R + c.output_low_resistance)


def one_shot_inflow(c: Circuit, v: float, *, charging: bool) -> float:
    assert charging
    return (c.supply - v) / c.R - c.i_discharge_leak


def power_on_inflow(c: Circuit, v: float, *, charging: bool) -> float:
    assert charging
    return (c.supply - v) / c.R


INFLOWS: dict[str, Callable[..., float]] = {
    "astable": astable_inflow,
    "astable-diode": diode_inflow,
    "output-fed": output_inflow,
    "schmitt": output_inflow,
    "one-shot": one_shot_inflow,
    "power-on": power_on_inflow,
}


def node_voltage(c: Circuit, inside: float, *, charging: bool) -> float:
    """The node's voltage: what flows in through the series resistance is what flows in at all."""
    if c.esr == 0:
        return inside

    def surplus(v: float) -> float:
        inflow = INFLOWS[c.topology](c, v, charging=charging) - outflow(c, v)
        return inflow - (v - inside) / c.esr

    low, high = inside - 3 * c.supply, inside + 3 * c.supply  # monotone: bisect
    for _ in range(200):
        middle = (low + high) / 2
        if middle in (low, high):
            break
        low, high = (middle, high) if surplus(middle) > 0 else (low, middle)
    return (low + high) / 2


def capacitor_slope(c: Circuit, inside: float, *, charging: bool) -> float:
    v = node_voltage(c, inside, charging=charging)
    current = INFLOWS[c.topology](c, v, charging=charging) - outflow(c, v)
    return current / (c.C + c.probe_c)


def phase(c: Circuit, inside: float, target: float, delay: float, *, charging: bool):
    """Integrate until the node crosses ``target`` and ``delay`` longer.

    Returns:
        The time taken and the capacitor's voltage then.
    """
    scale = (c.C + c.probe_c) * sum(r for r in (c.RA, c.RB, c.R) if not math.isnan(r))

    def slope(_: float, y: list[float]) -> list[float]:
        return [capacitor_slope(c, y[0], charging=charging) * scale]

    def crossed(_: float, y: list[float]) -> float:
        return node_voltage(c, y[0], charging=charging) - target

    crossed.terminal = True
    crossed.direction = 1 if charging else -1
    run = {"rtol": REL, "atol": ABS, "method": "DOP853"}
    # Steps short against the time constant, so that the handover of a diode is met closely.
    to_target = solve_ivp(slope, (0, 60), [inside], events=crossed, max_step=0.02, **run)
    assert to_target.status == 1, "the node never reached its threshold"
    taken, at_target = to_target.t_events[0][0], to_target.y_events[0][0][0]
    if delay == 0:
        return taken * scale, at_target
    after = solve_ivp(slope, (0, delay / scale), [at_target], max_step=0.02, **run)
    return taken * scale + delay, after.y[0][-1]


def integrated_times(c: Circuit) -> dict[str, float]:
    """The times of a circuit, by integration alone."""
    if c.topology == "power-on":
        taken, _ = phase(c, 0.0, c.v_upper, c.delay_upper, charging=True)
        return {"delay": taken}
    if c.topology == "one-shot":
        # The switch holds the node: (V - v)/R = (v - Vsat)/Ron.
        start = (c.supply * c.r_on + c.v_sat * c.R) / (c.R + c.r_on)
        taken, _ = phase(c, start, c.v_upper, c.delay_upper, charging=True)
        return {"t_high": taken}
    first, top = phase(c, 0.0, c.v_upper, c.delay_upper, charging=True)
    low, bottom = phase(c, top, c.v_lower, c.delay_lower, charging=False)
    high, _ = phase(c, bottom, c.v_upper, c.delay_upper, charging=True)
    return {"first_high": first, "t_low": low, "t_high": high}
