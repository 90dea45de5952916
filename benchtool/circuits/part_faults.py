"""Faults of the timing parts, as data."""

from __future__ import annotations

from benchtool.circuits import fault_moves as moves
from benchtool.circuits.fault_entry import HIGH, LOW, OPEN_OHM, SHORT_OHM, Fault
from benchtool.circuits.topologies import TOPOLOGIES

_ALL = tuple(TOPOLOGIES)
_ASTABLES = ("astable", "astable-diode")
_SINGLE_R = ("output-fed", "one-shot", "schmitt", "power-on")

CAPACITOR_FAULTS = (
    Fault(
        name="C-low",
        topologies=_ALL,
        part="C",
        move=moves.scale("C"),
        sizes=LOW,
        seen="All times are short by the same share; the duty has not moved.",
    ),
    Fault(
        name="C-high",
        topologies=_ALL,
        part="C",
        move=moves.scale("C"),
        sizes=HIGH,
        seen="All times are long by the same share; the duty has not moved.",
    ),
    Fault(
        name="C-leaky",
        topologies=_ALL,
        part="C",
        move=moves.parallel("shunt_ohm"),
        unit="ohm",
        sizes=(4.0, 50.0),
        reference=moves.charge_ohm,
        seen="The high time is long and the low time a little short; worse when warm.",
    ),
    Fault(
        name="C-esr",
        topologies=_ALL,
        part="C",
        move=moves.add("esr"),
        unit="ohm",
        sizes=(0.02, 0.2),
        reference=moves.discharge_ohm,
        seen="Both times are short, and the capacitor's trace jumps at its turning points.",
    ),
    Fault(
        name="C-open",
        topologies=_ALL,
        part="C",
        move=moves.put("C"),
        unit="F",
        sizes=(10e-12, 100e-12),
        seen="Far too fast: only stray capacitance and the delays of the IC are left.",
    ),
    Fault(
        name="C-short",
        topologies=_ALL,
        part="C",
        move=moves.parallel("shunt_ohm"),
        unit="ohm",
        sizes=SHORT_OHM,
        seen="The output stands still in its first state and the node stays at 0 V.",
    ),
)
RESISTOR_FAULTS = (
    Fault(
        name="RA-low",
        topologies=_ASTABLES,
        part="RA",
        move=moves.scale("RA"),
        sizes=LOW,
        seen="The high time is short, the low time as designed.",
    ),
    Fault(
        name="RA-high",
        topologies=_ASTABLES,
        part="RA",
        move=moves.scale("RA"),
        sizes=HIGH,
        seen="The high time is long, the low time as designed.",
    ),
    Fault(
        name="RA-open",
        topologies=_ASTABLES,
        part="RA",
        move=moves.put("RA"),
        unit="ohm",
        sizes=OPEN_OHM,
        seen="The output stays high after power-up: nothing charges the capacitor.",
    ),
    Fault(
        name="RB-low",
        topologies=_ASTABLES,
        part="RB",
        move=moves.scale("RB"),
        sizes=LOW,
        seen="The low time is short, the high time by a smaller share.",
    ),
    Fault(
        name="RB-high",
        topologies=_ASTABLES,
        part="RB",
        move=moves.scale("RB"),
        sizes=HIGH,
        seen="The low time is long, the high time by a smaller share.",
    ),
    Fault(
        name="RB-open",
        topologies=_ASTABLES,
        part="RB",
        move=moves.put("RB"),
        unit="ohm",
        sizes=OPEN_OHM,
        seen="The output stands still: in its first state, or low where a diode charges.",
    ),
    Fault(
        name="R-all-low",
        topologies=_ASTABLES,
        part="board",
        move=moves.scale("RA", "RB"),
        sizes=LOW,
        seen="All times are short by the same share; the output looks as with a low capacitor.",
    ),
    Fault(
        name="R-all-high",
        topologies=_ASTABLES,
        part="board",
        move=moves.scale("RA", "RB"),
        sizes=HIGH,
        seen="All times are long by the same share; the output looks as with a high capacitor.",
    ),
    Fault(
        name="R-low",
        topologies=_SINGLE_R,
        part="R",
        move=moves.scale("R"),
        sizes=LOW,
        seen="All times are short by the same share.",
    ),
    Fault(
        name="R-high",
        topologies=_SINGLE_R,
        part="R",
        move=moves.scale("R"),
        sizes=HIGH,
        seen="All times are long by the same share.",
    ),
    Fault(
        name="R-open",
        topologies=_SINGLE_R,
        part="R",
        move=moves.put("R"),
        unit="ohm",
        sizes=OPEN_OHM,
        seen="The time never ends: nothing charges the capacitor.",
    ),
)
