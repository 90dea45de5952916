"""The timing node by Kirchhoff's current law, component by component.

Written without the closed forms, the drives or the settlings of the circuit model, so that the
two can disagree.
"""

from __future__ import annotations

import math
from collections.abc import Callable

from benchtool.circuits import Circuit
from benchtool.frozen import frozen_record

Current = Callable[[float], float]
"""Current into the node in amperes as a function of the node's voltage in volts."""


@frozen_record
class Phase:
    """One way in which the node is connected.

    Attributes:
        current: Current into capacitor and probe together, linear in the node's voltage.
        until_v: Node voltage at which the connection changes; ``inf`` where it does not.
    """

    current: Current
    until_v: float = math.inf


def charge_phases(circuit: Circuit) -> tuple[Phase, ...]:
    """Return the connections of the charging node in order."""
    if circuit.topology == "astable-diode":
        return _diode_phases(circuit)
    feed = {
        "astable": _through_both,
        "output-fed": _from_high_output,
        "schmitt": _from_high_output,
        "one-shot": _from_supply_with_switch,
        "power-on": _from_supply,
    }[circuit.topology]
    return (Phase(current=_loaded(circuit, feed(circuit))),)


def discharge_phase(circuit: Circuit) -> Phase:
    """Return the connection of the discharging node."""
    if circuit.topology in ("astable", "astable-diode"):
        return Phase(current=_loaded(circuit, _into_switch(circuit)))
    supply = float(circuit.output_low)
    resistance = float(circuit.R) + float(circuit.output_low_resistance)
    return Phase(current=_loaded(circuit, lambda v: (supply - v) / resistance))


def closed_switch_v(circuit: Circuit, pull_up_ohm: float) -> float:
    """Return the voltage at the closed switch under a pull-up from the supply, volts."""
    supply, v_sat, r_on = float(circuit.supply), float(circuit.v_sat), float(circuit.r_on)
    return v_sat + (supply - v_sat) * r_on / (pull_up_ohm + r_on)


def _loaded(circuit: Circuit, feed: Current) -> Current:
    """Return what is left of ``feed`` after probe, leaks and sunk currents."""
    to_ground = 1 / float(circuit.probe_r) + 1 / float(circuit.shunt_ohm)
    to_rail, rail = 1 / float(circuit.leak_ohm), float(circuit.leak_to_v)
    sunk = float(circuit.i_bias) + float(circuit.i_leak)
    return lambda v: feed(v) - v * to_ground - (v - rail) * to_rail - sunk


def _through_both(circuit: Circuit) -> Current:
    """Feed through RA and RB; the open switch leaks where they meet."""
    supply, leak = float(circuit.supply), float(circuit.i_discharge_leak)
    RA, RB = float(circuit.RA), float(circuit.RB)

    def current(v: float) -> float:
        # (supply - x)/RA - leak = (x - v)/RB at the pin's voltage x
        x = (supply / RA - leak + v / RB) / (1 / RA + 1 / RB)
        return (x - v) / RB

    return current


def _diode_phases(circuit: Circuit) -> tuple[Phase, ...]:
    """Feed through RA and the diode while RB drops more than the diode, then through both."""
    supply, leak = float(circuit.supply), float(circuit.i_discharge_leak)
    RA, RB, drop = float(circuit.RA), float(circuit.RB), float(circuit.diode_drop)
    conducting = _loaded(circuit, lambda v: (supply - (v + drop)) / RA - leak)
    if circuit.series_diode_drop is not None:
        return (Phase(current=conducting),)
    # the diode goes off when all of RA's current passes RB at just that drop
    until_v = supply - drop - (drop / RB + leak) * RA
    both = _loaded(circuit, _through_both(circuit))
    return Phase(current=conducting, until_v=until_v), Phase(current=both)


def _into_switch(circuit: Circuit) -> Current:
    """Drain through RB into the closed switch, which RA pulls up."""
    supply, v_sat, r_on = float(circuit.supply), float(circuit.v_sat), float(circuit.r_on)
    RA, RB = float(circuit.RA), float(circuit.RB)
    series = float(circuit.series_diode_drop or 0.0)

    def current(v: float) -> float:
        if r_on == 0:
            return -(v - series - v_sat) / RB
        # (supply - x)/RA + (v - series - x)/RB = (x - v_sat)/r_on at the pin's voltage x
        x = (supply / RA + (v - series) / RB + v_sat / r_on) / (1 / RA + 1 / RB + 1 / r_on)
        return -(v - series - x) / RB

    return current


def _from_high_output(circuit: Circuit) -> Current:
    high = float(circuit.supply) - float(circuit.output_high_drop)
    resistance = float(circuit.R) + float(circuit.output_high_resistance)
    return lambda v: (high - v) / resistance


def _from_supply_with_switch(circuit: Circuit) -> Current:
    supply, leak, R = float(circuit.supply), float(circuit.i_discharge_leak), float(circuit.R)
    return lambda v: (supply - v) / R - leak


def _from_supply(circuit: Circuit) -> Current:
    supply, R = float(circuit.supply), float(circuit.R)
    return lambda v: (supply - v) / R
