"""Faults as data: which figures of the circuit each one moves, and what a person would see."""

from __future__ import annotations

import math
from collections.abc import Mapping
from types import MappingProxyType

from benchtool.circuits import fault_moves as moves
from benchtool.circuits.board_faults import BOARD_FAULTS, IC_FAULTS
from benchtool.circuits.circuit import Circuit, Value
from benchtool.circuits.fault_entry import Fault
from benchtool.circuits.part_faults import CAPACITOR_FAULTS, RESISTOR_FAULTS
from benchtool.circuits.topologies import TOPOLOGIES
from benchtool.errors import UsageError

HEALTHY = Fault(
    name="healthy",
    topologies=tuple(TOPOLOGIES),
    part=None,
    move=moves.nothing(),
    unit="",
    seen="All times are where the design puts them, within the tolerances.",
)

FAULTS: Mapping[str, Fault] = MappingProxyType(
    {
        entry.name: entry
        for entry in (
            HEALTHY,
            *CAPACITOR_FAULTS,
            *RESISTOR_FAULTS,
            *IC_FAULTS,
            *BOARD_FAULTS,
        )
    }
)


def find_fault(name: str) -> Fault:
    """Return the fault called ``name``.

    Raises:
        UsageError: If there is none.
    """
    if name not in FAULTS:
        raise UsageError(f"there is no fault called {name!r}", hint=f"Known: {', '.join(FAULTS)}.")
    return FAULTS[name]


def faults_of(topology: str) -> tuple[Fault, ...]:
    """Return the faults that can happen in a topology, the healthy board first."""
    return tuple(fault for fault in FAULTS.values() if topology in fault.topologies)


def size_range(fault: Fault, circuit: Circuit) -> tuple[float, float]:
    """Return the usual sizes of a fault on one board, in the fault's unit."""
    reference = float(fault.reference(circuit))
    return fault.sizes[0] * reference, fault.sizes[1] * reference


def apply_fault(name: str, circuit: Circuit, size: Value | None = None) -> Circuit:
    """Return the circuit with a fault.

    Args:
        name: Name of the fault.
        circuit: The healthy circuit.
        size: In the fault's unit; None for a usual one (the geometric middle of the range).

    Raises:
        UsageError: If there is no such fault, or not in this topology.
    """
    fault = find_fault(name)
    if circuit.topology not in fault.topologies:
        known = ", ".join(entry.name for entry in faults_of(circuit.topology))
        raise UsageError(
            f"{name} cannot happen in a circuit of topology {circuit.topology}",
            hint=f"Its faults: {known}.",
        )
    return fault.move.act(circuit, _usual_size(fault, circuit) if size is None else size)


def _usual_size(fault: Fault, circuit: Circuit) -> float:
    low, high = size_range(fault, circuit)
    if low < 0 < high:
        return high
    return math.sqrt(low * high) if low > 0 else (low + high) / 2
