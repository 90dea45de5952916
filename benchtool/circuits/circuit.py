"""A timed circuit as numbers: what the closed forms need and nothing else."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import replace
from typing import Any

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.design import TopologyName

Value = float | FloatArray
"""One board, or a row of boards that differ (shapes broadcast)."""


@frozen_record(eq=False)
class Circuit:
    """One timed circuit: the parts, the IC's terms and what loads the timing node.

    Every figure is a float, or an array where many boards are computed at once.

    Attributes:
        topology: Name of its entry in the table of topologies.
        RA: Resistor from the supply to the discharge pin, ohms.
        RB: Resistor from the discharge pin to the timing node, ohms.
        R: The one timing resistor of the other topologies, ohms.
        C: Timing capacitor, farads.
        esr: Equivalent series resistance of the capacitor, ohms.
        supply: Supply, volts.
        v_upper: Upper threshold, volts.
        v_lower: Lower threshold, volts.
        v_control: Control pin, volts: it sets both thresholds, and does not see a comparator's own
            shift; NaN where there is none.
        v_sat: Saturation voltage of the discharge switch at no current, volts.
        r_on: On-resistance of the discharge switch, ohms.
        i_discharge_leak: Current sunk by the open discharge switch, amperes.
        i_bias: Current sunk by the threshold input, amperes.
        i_leak: Current sunk by the capacitor's leakage, amperes.
        delay_upper: Time from the node's crossing of the upper threshold to its turning, seconds.
        delay_lower: The same at the lower threshold, seconds.
        output_high_drop: Supply minus the high output without load, volts.
        output_high_resistance: Source resistance of the high output, ohms.
        output_low: Low output without load, volts.
        output_low_resistance: Source resistance of the low output, ohms.
        diode_drop: Forward drop of the steering diode, volts.
        series_diode_drop: Forward drop of the diode in series with RB, volts; None without one.
        probe_r: Probe resistance from the timing node to 0 V, ohms.
        probe_c: Probe capacitance at the timing node, farads.
        shunt_ohm: Any other resistance from the timing node to 0 V, ohms.
        leak_ohm: Leak resistance from the timing node to ``leak_to_v``, ohms.
        leak_to_v: Rail of that leak, volts.
        divide: The output counts this many cycles.
        family: Family of the IC, None where its terms are stated.
    """

    topology: TopologyName
    C: Value
    supply: Value
    v_upper: Value
    v_lower: Value = 0.0
    v_control: Value = math.nan
    RA: Value = math.nan
    RB: Value = math.nan
    R: Value = math.nan
    esr: Value = 0.0
    v_sat: Value = 0.0
    r_on: Value = 0.0
    i_discharge_leak: Value = 0.0
    i_bias: Value = 0.0
    i_leak: Value = 0.0
    delay_upper: Value = 0.0
    delay_lower: Value = 0.0
    output_high_drop: Value = 0.0
    output_high_resistance: Value = 0.0
    output_low: Value = 0.0
    output_low_resistance: Value = 0.0
    diode_drop: Value = 0.0
    series_diode_drop: Value | None = None
    probe_r: Value = math.inf
    probe_c: Value = 0.0
    shunt_ohm: Value = math.inf
    leak_ohm: Value = math.inf
    leak_to_v: Value = 0.0
    divide: int = 1
    family: str | None = None


def with_fields(circuit: Circuit, changes: Mapping[str, Value]) -> Circuit:
    """Return the circuit with some of its figures changed, by field name."""
    named: dict[str, Any] = dict(changes)
    return replace(circuit, **named)
