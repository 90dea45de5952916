"""From a solved model to the products and figures that are reported."""

from __future__ import annotations

from collections.abc import Iterator

from benchtool.circuits.circuit import Circuit, Value
from benchtool.circuits.fit import Fit
from benchtool.circuits.prediction import settle_states
from benchtool.circuits.taus import products
from benchtool.circuits.topologies import Topology
from benchtool.model.judgement import PartEstimate, Solution
from benchtool.model.quantity import Notice


def report_solution(
    topology: Topology,
    found: Fit | None,
    parts: tuple[PartEstimate, ...],
    warnings: tuple[Notice, ...] = (),
) -> Solution:
    """Return the products with their uncertainties, and what is to be said about them.

    Args:
        topology: The topology.
        found: The solved products; None where the times give none.
        parts: Part values under their assumptions.
        warnings: What was assumed on the way.
    """
    said = (*warnings, *_contradicted(parts))
    if found is None:
        return Solution(topology=topology.name, parts=parts, warnings=said)
    two = topology.has_two_products
    return Solution(
        topology=topology.name,
        tau_charge=found.carry(lambda circuit: products(circuit).tau_charge, "s"),
        tau_discharge=found.carry(lambda circuit: products(circuit).tau_discharge, "s"),
        tau_RA=found.carry(_tau_RA, "s") if "RA" in topology.parts else None,
        tau_ratio=found.carry(_tau_ratio, "1") if two else None,
        effective_charge=found.carry(_effective_charge, "s"),
        effective_discharge=(
            found.carry(_effective_discharge, "s") if topology.discharge else None
        ),
        parts=parts,
        warnings=said,
    )


def _tau_RA(circuit: Circuit) -> Value:
    return circuit.RA * circuit.C


def _tau_ratio(circuit: Circuit) -> Value:
    found = products(circuit)
    return found.tau_charge / found.tau_discharge


def _effective_charge(circuit: Circuit) -> Value:
    return settle_states(circuit).effective_charge.tau


def _effective_discharge(circuit: Circuit) -> Value:
    discharge = settle_states(circuit).discharge
    if discharge is None:
        raise ValueError(f"a circuit of topology {circuit.topology} does not discharge by itself")
    return discharge.tau


def _contradicted(parts: tuple[PartEstimate, ...]) -> Iterator[Notice]:
    refs = [part.ref for part in parts if part.estimate is None]
    if refs:
        yield Notice(
            code="parts-contradict",
            text=f"no value for {', '.join(refs)}: with the other parts as marked within their "
            "tolerances no single value gives all the times",
        )
