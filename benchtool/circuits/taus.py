"""The products of resistance and capacitance that the times stand for."""

from __future__ import annotations

from benchtool.circuits.circuit import Circuit, Value
from benchtool.circuits.topologies import find_topology
from benchtool.frozen import frozen_record


@frozen_record(eq=False)
class Products:
    """Products of the parts alone, seconds.

    Attributes:
        tau_charge: (RA+RB)·C for the astable, RA·C with a steering diode, else R·C.
        tau_discharge: RB·C for both astables, else R·C.
        tau_RA: RA·C; None where the topology has no RA.
    """

    tau_charge: Value
    tau_discharge: Value
    tau_RA: Value | None


def products(circuit: Circuit) -> Products:
    """Return the products of the parts of a circuit."""
    topology = find_topology(circuit.topology)
    charge, discharge = (_resistance(circuit, refs) for refs in topology.resistors)
    return Products(
        tau_charge=charge * circuit.C,
        tau_discharge=discharge * circuit.C,
        tau_RA=circuit.RA * circuit.C if "RA" in topology.parts else None,
    )


def _resistance(circuit: Circuit, refs: tuple[str, ...]) -> Value:
    total: Value = 0.0
    for ref in refs:
        total = total + getattr(circuit, ref)
    return total
