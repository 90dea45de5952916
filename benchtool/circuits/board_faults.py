"""Faults of the IC and the board around the timing parts, as data."""

from __future__ import annotations

from benchtool.circuits import fault_moves as moves
from benchtool.circuits.fault_entry import SHORT_OHM, Fault
from benchtool.circuits.topologies import TOPOLOGIES

_ALL = tuple(TOPOLOGIES)
_SWITCHED = ("astable", "astable-diode", "one-shot")
_CONTROLLED = ("astable", "astable-diode", "output-fed", "one-shot")
_OSCILLATORS = ("astable", "astable-diode", "output-fed", "schmitt")
_OUTPUT_DRIVEN = ("output-fed", "schmitt")

IC_FAULTS = (
    Fault(
        name="discharge-leak",
        topologies=_SWITCHED,
        part="IC",
        move=moves.add("i_discharge_leak"),
        unit="A",
        sizes=(0.01, 0.2),
        reference=moves.pull_up_a,
        seen="The high time is long, the low time as designed; worse when warm.",
    ),
    Fault(
        name="discharge-weak",
        topologies=_SWITCHED,
        part="IC",
        move=moves.add("r_on"),
        unit="ohm",
        sizes=(0.02, 0.3),
        reference=moves.discharge_ohm,
        seen="The low time is long, the high time as designed; a one-shot is short.",
    ),
    Fault(
        name="control-low",
        topologies=_CONTROLLED,
        part="board",
        move=moves.scale("v_upper", "v_lower", "v_control"),
        sizes=(-0.3, -0.05),
        seen="The high time is short, the low time as designed; the control pin reads low.",
    ),
    Fault(
        name="control-high",
        topologies=_CONTROLLED,
        part="board",
        move=moves.scale("v_upper", "v_lower", "v_control"),
        sizes=(0.05, 0.25),
        seen="The high time is long, the low time as designed; the control pin reads high.",
    ),
    # 0.1 µF at the control pin shortens the period of the published highest-frequency circuit by
    # about 10 % (SLFS043); there the delays are all but the whole of it. Without, they are longer.
    Fault(
        name="control-bypass-missing",
        topologies=_CONTROLLED,
        part="board",
        move=moves.scale("delay_upper", "delay_lower"),
        sizes=(0.05, 0.3),
        seen="Jitter; the mean times move on fast circuits only, which turn slower.",
    ),
    Fault(
        name="upper-threshold",
        topologies=_ALL,
        part="IC",
        move=moves.scale("v_upper"),
        sizes=(-0.15, 0.15),
        seen="High and low time move together, the high time by twice as much.",
    ),
    Fault(
        name="lower-threshold",
        topologies=_OSCILLATORS,
        part="IC",
        move=moves.scale("v_lower"),
        sizes=(-0.3, 0.3),
        seen="High and low time move together, the low time by twice as much; the first high "
        "after power-up stays.",
    ),
    Fault(
        name="slow-ic",
        topologies=_ALL,
        part="IC",
        move=moves.add("delay_upper", "delay_lower"),
        unit="s",
        sizes=(0.2e-6, 5e-6),
        seen="All times are long by about the same amount; it shows on fast circuits.",
    ),
    Fault(
        name="wrong-ic-family",
        topologies=_CONTROLLED,
        part="IC",
        move=moves.other_family(),
        unit="",
        seen="Small shifts that grow with frequency and with large resistors; the output levels "
        "are those of the other family.",
    ),
    Fault(
        name="output-high-drop",
        topologies=_OUTPUT_DRIVEN,
        part="IC",
        move=moves.add("output_high_drop"),
        unit="V",
        sizes=(0.02, 0.2),
        reference=moves.supply_v,
        seen="The high time is long and the output's high level is low.",
    ),
    Fault(
        name="output-low-rise",
        topologies=_OUTPUT_DRIVEN,
        part="IC",
        move=moves.add("output_low"),
        unit="V",
        sizes=(0.02, 0.2),
        reference=moves.supply_v,
        seen="The low time is long and the output's low level is high.",
    ),
)
BOARD_FAULTS = (
    Fault(
        name="node-leak-to-supply",
        topologies=_ALL,
        part="board",
        move=moves.leak_to_supply(),
        unit="ohm",
        sizes=(4.0, 50.0),
        reference=moves.charge_ohm,
        seen="The low time is long and the high time a little short; worse when damp.",
    ),
    Fault(
        name="probe-load",
        topologies=_ALL,
        part="probe",
        move=moves.probe(),
        unit="ohm",
        sizes=(1e6, 10e6),
        seen="The times are right again when the probe leaves the capacitor.",
    ),
    Fault(
        name="diode-open",
        topologies=("astable-diode",),
        part="diode",
        move=moves.open_diode(),
        unit="",
        seen="The high time is that of RA and RB together, the low time as designed.",
    ),
    Fault(
        name="diode-short",
        topologies=("astable-diode",),
        part="diode",
        move=moves.short_diode(),
        unit="ohm",
        sizes=SHORT_OHM,
        seen="The low time is next to nothing, the high time a little short.",
    ),
)
