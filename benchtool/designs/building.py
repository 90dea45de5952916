"""From the validated tables of a design file to the records that the other rooms take."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

from benchtool.designs.lines import Path
from benchtool.designs.notation import key_text
from benchtool.designs.vocabulary import IC_TERMS, QUANTITIES, TOPOLOGY_PARTS, usual_quantities
from benchtool.model.design import (
    Derivation,
    Design,
    Ic,
    Instrument,
    Limit,
    Part,
    Probe,
    Rule,
    Stage,
)

if TYPE_CHECKING:
    from benchtool.designs.schema import DesignTable, StageTable
    from benchtool.designs.tables import IcTable, LimitsTable


def build_design(
    table: DesignTable, document: Mapping[str, Any], *, source: str, sha256: str
) -> Design:
    """Return the design that a validated table stands for."""
    board, decision, probe = table.board, table.decision, table.probe
    return Design(
        name=board.name,
        assembly=board.assembly,
        revision=board.revision,
        serial_pattern=board.serial_pattern,
        supply=board.supply,
        temperature=board.temperature,
        stages=tuple(_stage(name, stage) for name, stage in table.stage.items()),
        rule=Rule(name=decision.rule, guard=decision.guard, coverage=decision.coverage),
        instrument=Instrument(
            timebase_rel=table.instrument.timebase, jitter_rel=table.instrument.jitter
        ),
        probe=Probe(r_ohm=math.inf if probe.R is None else probe.R, c_f=probe.C, at=probe.at),
        source=source,
        sha256=sha256,
        stated=frozenset(_stated(document, ())),
    )


def _stage(name: str, stage: StageTable) -> Stage:
    # Not every topology has these three; the others keep them neutral.
    control_v, diode_drop_v, series_diode_drop_v = (
        getattr(stage, key, None) for key in ("control", "diode_drop", "series_diode_drop")
    )
    derive, quantities = _derivation(stage)
    refs = TOPOLOGY_PARTS[stage.topology]
    return Stage(
        name=name,
        topology=stage.topology,
        parts=MappingProxyType({ref: _part(ref, getattr(stage, ref)) for ref in refs}),
        ic=_ic(stage.ic),
        channel=stage.channel,
        capacitor=stage.capacitor,
        trigger=stage.trigger,
        active=stage.active,
        divide=stage.divide,
        limits=tuple(_limits(stage.limits)),
        derive=derive,
        quantities=quantities,
        control_v=control_v,
        diode_drop_v=diode_drop_v,
        series_diode_drop_v=series_diode_drop_v,
        leak_ohm=math.inf if stage.leak is None else stage.leak,
        leak_to_v=stage.leak_to or 0.0,
    )


def _part(ref: str, table: Any) -> Part:
    lower_rel, upper_rel = table.tolerance
    return Part(
        ref=ref,
        value=table.value,
        lower_rel=lower_rel,
        upper_rel=upper_rel,
        tempco_per_k=table.tempco,
        kind=table.kind,
        leakage_a=getattr(table, "leakage", 0.0),
        esr_ohm=getattr(table, "esr", 0.0),
    )


def _ic(table: IcTable | None) -> Ic:
    if table is None:
        return Ic()
    terms = {name: value for name in IC_TERMS if (value := getattr(table, name)) is not None}
    return Ic(
        family=table.family,
        terms=MappingProxyType(terms),
        upper_threshold=table.upper_threshold,
        lower_threshold=table.lower_threshold,
    )


def _derivation(stage: StageTable) -> tuple[Derivation | None, tuple[str, ...]]:
    """Return how limits are derived and for what; either one alone calls for the other."""
    limits = stage.limits
    if limits is None or not (limits.derive or limits.quantities):
        return None, ()
    usual = usual_quantities(stage.topology, stage.divide)
    return limits.derive or "worst-case", tuple(limits.quantities or usual)


def _limits(table: LimitsTable | None) -> Iterator[Limit]:
    for quantity, about in QUANTITIES.items():
        stated = getattr(table, quantity, None)
        if stated is None:
            continue
        lower, upper = stated.lower, stated.upper
        relative = any(bound[1] for bound in (lower, upper) if bound)
        yield Limit(
            quantity=quantity,
            lower=lower[0] if lower else None,
            upper=upper[0] if upper else None,
            unit="1" if relative else about.unit,
            source=stated.source,
            relative=relative,
        )


def _stated(node: Mapping[str, Any], path: Path) -> Iterator[str]:
    """Yield the key of every value and table that the file states."""
    for key, value in node.items():
        yield key_text((*path, key))
        if isinstance(value, dict):
            yield from _stated(value, (*path, key))
