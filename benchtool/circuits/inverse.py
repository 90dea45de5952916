"""Inverse: from measured times to the products of the parts."""

from __future__ import annotations

import math
from collections.abc import Mapping
from types import MappingProxyType

from benchtool.circuits.estimates import estimate_by_marking, estimate_from_known
from benchtool.circuits.ideal import bare_circuit
from benchtool.circuits.observations import observe
from benchtool.circuits.product_fit import Case, solve_products
from benchtool.circuits.solution import report_solution
from benchtool.circuits.topologies import Topology, find_topology
from benchtool.errors import SolveError, UsageError
from benchtool.model.design import Design, Ic, Stage, TopologyName
from benchtool.model.judgement import Solution
from benchtool.model.timing import Timing

NOTHING_KNOWN: Mapping[str, float] = MappingProxyType({})


def solve(
    timing: Timing, stage: Stage, design: Design, *, known: Mapping[str, float] = NOTHING_KNOWN
) -> Solution:
    """Solve measured times for the products of the parts of a designed stage.

    Args:
        timing: t_high and t_low, or period and duty, and first_high where it was seen; delay for
            a power-on circuit. Bounds are left aside.
        stage: The stage; its part values give the terms of second order.
        design: The design that the stage belongs to.
        known: Part values taken as known, SI units by reference.

    Returns:
        Products of the parts alone, the effective time constants and part values, each with what
        it assumes. Where the times suffice for no product (a divided astable) only the parts.

    Raises:
        SolveError: If no parts give these times, or the times are too few.
        UsageError: If a known part is not one of the topology or not greater than 0.
    """
    topology = find_topology(stage.topology)
    _refuse_unknown_parts(topology, known)
    observations = observe(timing, topology, stage.divide)
    case = Case(stage=stage, design=design, observations=observations, known=known, marked=True)
    found = solve_products(case)
    if known:
        parts = estimate_from_known(stage, design, found.used, known, marked=True)
    else:
        parts = estimate_by_marking(stage, design, found.used)
    return report_solution(topology, found.fit, parts, found.warnings)


def solve_without_design(
    timing: Timing,
    topology: TopologyName,
    *,
    ic: Ic | None = None,
    supply_v: float | None = None,
    known: Mapping[str, float] = NOTHING_KNOWN,
) -> Solution:
    """Solve measured times for the products where no part value is on record.

    Args:
        timing: As for ``solve``.
        topology: Name of the topology.
        ic: The IC; None takes the CMOS family, and says so.
        supply_v: Supply in volts; None leaves out the terms in volts, and says so.
        known: Part values taken as known; with one of them the others follow.

    Raises:
        SolveError: If no parts give these times, or the times are too few.
        UsageError: If the topology cannot be solved without a supply or thresholds.
    """
    entry = find_topology(topology)
    _refuse_unknown_parts(entry, known)
    observations = observe(timing, entry)
    bare = bare_circuit(entry, ic, supply_v, known)
    case = Case(
        stage=bare.stage,
        design=bare.design,
        observations=observations,
        known=known,
        marked=False,
    )
    found = solve_products(case)
    if found.fit is None:
        raise SolveError(
            f"the times given do not suffice for the two products of the {entry.name} circuit",
            hint="Give t_high and t_low, or period and duty.",
            code="too-few-times",
        )
    parts = estimate_from_known(bare.stage, bare.design, found.used, known, marked=False)
    return report_solution(entry, found.fit, parts, (*bare.warnings, *found.warnings))


def _refuse_unknown_parts(topology: Topology, known: Mapping[str, float]) -> None:
    for ref, value in known.items():
        if ref not in topology.parts:
            raise UsageError(
                f"{topology.name} has no part {ref}",
                hint=f"Its parts: {', '.join(topology.parts)}.",
            )
        if not (math.isfinite(value) and value > 0):
            raise UsageError(f"{ref} must be greater than 0", hint="Give its value with its unit.")
