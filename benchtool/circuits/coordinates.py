"""What may vary on a board, and the circuit at any point of it."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from types import MappingProxyType
from typing import Literal

import numpy as np

from benchtool.circuits.circuit import Circuit, Value
from benchtool.circuits.families import Term, find_family
from benchtool.circuits.topologies import Topology, find_topology
from benchtool.errors import DesignError
from benchtool.frozen import frozen_record
from benchtool.model.design import REFERENCE_TEMPERATURE_C, Band, Design, Part, Stage, Threshold

Kind = Literal["part", "supply", "temperature", "leakage", "ic"]
Law = Literal["rectangular", "normal"]
Point = Mapping[str, Value]

NOWHERE: Point = MappingProxyType({})
U_DIODE_V = 0.05
"""Standard uncertainty of a diode drop, volts: from memory."""

_FIELDS = {
    "discharge_saturation": "v_sat",
    "discharge_resistance": "r_on",
    "discharge_leakage": "i_discharge_leak",
    "bias_current": "i_bias",
}
_EVERYWHERE = ("supply", "temperature", "leakage", "upper_threshold", "threshold_split")


@frozen_record
class Coordinate:
    """One thing that may vary from board to board.

    Attributes:
        name: A part's reference, ``supply`` (V), ``temperature`` (degC), ``leakage`` (A), a term of
            the IC by its design-file name, ``upper_threshold`` (relative shift, the lower one
            going with it), ``threshold_split`` (relative shift of the lower threshold against the
            upper), ``diode_drop`` or ``series_diode_drop`` (V).
        kind: What it belongs to.
        centre: Value of the nominal board.
        lower, upper: Range: tolerance limits, or ±2u for a normal law.
        u: Standard uncertainty.
        law: Its distribution; rectangular between ``lower`` and ``upper``.
    """

    name: str
    kind: Kind
    centre: float
    lower: float
    upper: float
    u: float
    law: Law


def coordinates(stage: Stage, design: Design) -> tuple[Coordinate, ...]:
    """Return all that may vary on this stage; what has no spread is left out.

    Args:
        stage: A stage of ``design``.
        design: Gives supply and temperature.
    """
    topology = find_topology(stage.topology)
    found = [
        *_part_coordinates(stage, topology),
        *_surroundings(stage, design),
        *_threshold_coordinates(stage),
        *_term_coordinates(stage, topology, design.supply.nominal),
        *_diode_coordinates(stage, design),
    ]
    return tuple(item for item in found if item.upper > item.lower)


def _ranged(name: str, kind: Kind, band: Band) -> Coordinate:
    return Coordinate(
        name=name,
        kind=kind,
        centre=band.nominal,
        lower=band.lower,
        upper=band.upper,
        u=(band.upper - band.lower) / math.sqrt(12),
        law="rectangular",
    )


def _spread(name: str, centre: float, u: float) -> Coordinate:
    return Coordinate(
        name=name,
        kind="ic",
        centre=centre,
        lower=centre - 2 * u,
        upper=centre + 2 * u,
        u=u,
        law="normal",
    )


def _part_coordinates(stage: Stage, topology: Topology) -> Iterator[Coordinate]:
    for ref in topology.parts:
        part = stage.parts[ref]
        lower, upper = part.value * (1 + part.lower_rel), part.value * (1 + part.upper_rel)
        yield _ranged(ref, "part", Band(nominal=part.value, lower=lower, upper=upper))


def _surroundings(stage: Stage, design: Design) -> Iterator[Coordinate]:
    yield _ranged("supply", "supply", design.supply)
    if any(part.tempco_per_k for part in stage.parts.values()):
        yield _ranged("temperature", "temperature", design.temperature)
    most_a = stage.parts["C"].leakage_a
    yield _ranged("leakage", "leakage", Band(nominal=most_a / 2, lower=0.0, upper=most_a))


def _threshold_coordinates(stage: Stage) -> Iterator[Coordinate]:
    yield _spread("upper_threshold", 0.0, u_threshold(stage))
    topology = find_topology(stage.topology)
    if topology.discharge is not None:
        yield _spread("threshold_split", 0.0, u_split(stage))


def _term_coordinates(stage: Stage, topology: Topology, supply_v: float) -> Iterator[Coordinate]:
    for name in topology.ic_terms:
        centre = float(term_value(stage, name, supply_v))
        term = _family_term(stage, name)
        u = abs(centre) * term.u_rel if term else 0.0
        if term and term.law == "rectangular":
            yield _ranged(name, "ic", Band(nominal=centre, lower=0.0, upper=2 * centre))
        else:
            yield _spread(name, centre, u)


def _diode_coordinates(stage: Stage, design: Design) -> Iterator[Coordinate]:
    if stage.topology != "astable-diode":
        return
    drop_v = _diode_drop(stage, design.supply.nominal, stage.parts["RA"].value)
    yield _spread("diode_drop", float(drop_v), U_DIODE_V)
    if stage.series_diode_drop_v is not None:
        yield _spread("series_diode_drop", stage.series_diode_drop_v, U_DIODE_V)


def _family_term(stage: Stage, name: str) -> Term | None:
    return find_family(stage.ic.family).terms[name] if stage.ic.family else None


def term_value(stage: Stage, name: str, supply_v: Value) -> Value:
    """Return a term of the IC: as stated, else the family's starting value, else 0."""
    if name in stage.ic.terms:
        return stage.ic.terms[name]
    term = _family_term(stage, name)
    return term.at(supply_v) if term else 0.0


def term_origin(stage: Stage, name: str) -> str:
    """Say where a term of the IC comes from."""
    if name in stage.ic.terms:
        return "stated in the design"
    term = _family_term(stage, name)
    return term.origin if term else "taken as ideal"


def u_threshold(stage: Stage) -> float:
    """Return the relative standard uncertainty of the upper threshold."""
    return float(term_value(stage, "u_threshold", math.nan))


def u_split(stage: Stage) -> float:
    """Return the relative standard uncertainty of lower over upper threshold.

    The thresholds of a Schmitt inverter come from no divider: unless stated, the lower one is
    taken to vary by as much again.
    """
    if find_topology(stage.topology).thresholds_stated and "u_split" not in stage.ic.terms:
        return u_threshold(stage)
    return float(term_value(stage, "u_split", math.nan))


def circuit_at(stage: Stage, design: Design, point: Point = NOWHERE) -> Circuit:
    """Return the circuit at a point; coordinates not in ``point`` are at their centre.

    Args:
        stage: A stage of ``design``.
        design: Gives supply, temperature and probe.
        point: Coordinate name to value, floats or arrays that broadcast.

    Raises:
        ValueError: If ``point`` names no coordinate of this stage.
        DesignError: If the topology needs thresholds and the stage states none.
    """
    topology = find_topology(stage.topology)
    _refuse_strangers(topology, point)
    supply = point.get("supply", design.supply.nominal)
    warmth_k = point.get("temperature", design.temperature.nominal) - REFERENCE_TEMPERATURE_C
    parts = {ref: _part_value(stage.parts[ref], point, warmth_k) for ref in topology.parts}
    upper, lower = _thresholds(stage, topology, supply, point)
    terms = {
        _FIELDS.get(name, name): point.get(name, term_value(stage, name, supply))
        for name in topology.ic_terms
    }
    return Circuit(
        topology=stage.topology,
        supply=supply,
        v_upper=upper,
        v_lower=lower,
        v_control=upper if topology.forced_by_control else math.nan,
        esr=stage.parts["C"].esr_ohm,
        i_leak=point.get("leakage", stage.parts["C"].leakage_a / 2),
        leak_ohm=stage.leak_ohm,
        leak_to_v=stage.leak_to_v,
        divide=stage.divide,
        family=stage.ic.family,
        **parts,
        **terms,
        **_diodes(stage, point, supply),
        **_probe(design),
    )


def _refuse_strangers(topology: Topology, point: Point) -> None:
    known = {*topology.parts, *_EVERYWHERE, *topology.ic_terms, "diode_drop", "series_diode_drop"}
    strangers = sorted(set(point) - known)
    if strangers:
        raise ValueError(f"no coordinate of {topology.name}: {', '.join(strangers)}")


def _part_value(part: Part, point: Point, warmth_k: Value) -> Value:
    return point.get(part.ref, part.value) * (1 + part.tempco_per_k * warmth_k)


def _thresholds(
    stage: Stage, topology: Topology, supply: Value, point: Point
) -> tuple[Value, Value]:
    """Return both thresholds in volts; a forced control pin moves the upper, the lower follows."""
    stated_upper, stated_lower = stage.ic.upper_threshold, stage.ic.lower_threshold
    if topology.thresholds_stated and (stated_upper is None or stated_lower is None):
        raise DesignError(
            f"stage {stage.name} does not state the thresholds of its {topology.name} circuit",
            hint="State ic.upper_threshold and ic.lower_threshold, in volts or % of the supply.",
        )
    upper = _volts(stated_upper, supply) if stated_upper else supply * 2 / 3
    lower = _volts(stated_lower, supply) if stated_lower else upper / 2
    if stage.control_v is not None and topology.forced_by_control:
        lower = lower / upper * stage.control_v
        upper = stage.control_v
    shift = 1 + point.get("upper_threshold", 0.0)
    return upper * shift, lower * shift * (1 + point.get("threshold_split", 0.0))


def _volts(threshold: Threshold, supply: Value) -> Value:
    return threshold.value * supply if threshold.of_supply else threshold.value


def _diode_drop(stage: Stage, supply: Value, RA: Value) -> Value:
    """Return the steering diode's drop, volts: as stated, else 0.6 V + 0.11 V a decade of mA.

    References:
        From memory; taken at i = V/(2·RA), the middle of the charge.
    """
    if stage.diode_drop_v is not None:
        return stage.diode_drop_v
    drop: Value = 0.6 + 0.11 * np.log10(supply / (2 * RA) / 1e-3)
    return drop


def _diodes(stage: Stage, point: Point, supply: Value) -> dict[str, Value]:
    if stage.topology != "astable-diode":
        return {}
    own_drop = _diode_drop(stage, supply, point.get("RA", stage.parts["RA"].value))
    drops = {"diode_drop": point.get("diode_drop", own_drop)}
    if stage.series_diode_drop_v is not None:
        drops["series_diode_drop"] = point.get("series_diode_drop", stage.series_diode_drop_v)
    return drops


def _probe(design: Design) -> dict[str, Value]:
    if design.probe.at != "capacitor":
        return {}
    return {"probe_r": design.probe.r_ohm, "probe_c": design.probe.c_f}
