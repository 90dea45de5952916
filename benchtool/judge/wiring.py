"""Are the parts ones that the IC can work with: currents, resistances, leakage stated."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from benchtool.circuits import find_topology
from benchtool.model.decision import Concern
from benchtool.model.design import Design, Part, Stage
from benchtool.units import format_value

LEAST_RA_OHM = 1e3
"""The published timing error is stated for RA from 1 kΩ: SLFS022, SLFS043."""

_LEAKY_KINDS = ("electrolytic", "tantalum", "aluminium", "aluminum")

# Greatest current of the discharge pin for which an on-voltage is published, over the supply.
_SWITCH_POINTS = {
    "bipolar": ((5.0, 4.5e-3), (15.0, 15e-3), "Doc ID 2182 Rev 6"),
    "cmos": ((5.0, 10e-3), (15.0, 100e-3), "SLFS043"),
}

_MOST_TOTAL = ((5.0, 3.4e6), (15.0, 10e6))
"""Greatest RA + RB of the bipolar timer over the supply, volts and ohms: SLFS022."""


def examine_parts(stage: Stage, design: Design) -> Iterator[Concern]:
    """Yield concerns about the parts of a stage.

    Args:
        stage: A stage of ``design``.
        design: Gives the supply.
    """
    yield from _switch_current(stage, design)
    yield from _total_resistance(stage, design)
    yield from _leakage(stage, stage.parts["C"], design)


def _pull_up(stage: Stage) -> Part | None:
    """Return the resistor that the discharge switch shorts to 0 V."""
    uses_switch = "discharge_resistance" in find_topology(stage.topology).ic_terms
    return (stage.parts.get("RA") or stage.parts.get("R")) if uses_switch else None


def _switch_current(stage: Stage, design: Design) -> Iterator[Concern]:
    part = _pull_up(stage)
    if part is None:
        return
    key = f"stage.{stage.name}.{part.ref}"
    current_a = design.supply.upper / (part.value * (1 + part.lower_rel))
    known = _SWITCH_POINTS.get(stage.ic.family or "")
    most_a = _between(known[0], known[1], design.supply.upper) if known else None
    if known is not None and most_a is not None and current_a > most_a:
        yield Concern(
            severity="warning",
            key=key,
            text=(
                f"The discharge switch sinks {format_value(current_a, 'A', 3)} through "
                f"{part.ref} = {format_value(part.value, 'ohm')}; its on-voltage is published "
                f"up to {format_value(most_a, 'A', 2)} at this supply ({known[2]})."
            ),
            hint=f"Use a larger {part.ref} with a smaller C.",
        )
    elif part.value < LEAST_RA_OHM:
        yield Concern(
            severity="warning",
            key=key,
            text=(
                f"{part.ref} = {format_value(part.value, 'ohm')} lies below the 1 kΩ from which "
                f"the timing error is published (SLFS022, SLFS043); the discharge switch sinks "
                f"{format_value(current_a, 'A', 3)}."
            ),
            hint=f"Use a larger {part.ref} with a smaller C, or state the terms of the IC.",
        )


def _between(first: tuple[float, float], last: tuple[float, float], supply_v: float) -> float:
    """Return the figure at a supply on the line through two published points, held beyond them."""
    return float(np.interp(supply_v, (first[0], last[0]), (first[1], last[1])))


def _total_resistance(stage: Stage, design: Design) -> Iterator[Concern]:
    refs = find_topology(stage.topology).resistors[0]
    if stage.ic.family != "bipolar" or "bias_current" in stage.ic.terms:
        return
    total_ohm = sum(stage.parts[ref].value * (1 + stage.parts[ref].upper_rel) for ref in refs)
    most_ohm = _between(*_MOST_TOTAL, design.supply.lower)
    if total_ohm <= most_ohm:
        return
    yield Concern(
        severity="warning",
        key=f"stage.{stage.name}.{refs[0]}",
        text=(
            f"{' + '.join(refs)} reaches {format_value(total_ohm, 'ohm', 3)}; the threshold "
            f"input's current allows {format_value(most_ohm, 'ohm', 3)} at "
            f"{format_value(design.supply.lower, 'V', 3)} "
            "(SLFS022: 3.4 MΩ at 5 V, 10 MΩ at 15 V)."
        ),
        hint="Use smaller resistors with a larger C, or a CMOS timer.",
    )


def _leakage(stage: Stage, capacitor: Part, design: Design) -> Iterator[Concern]:
    if capacitor.kind is None or capacitor.leakage_a > 0:
        return
    if not any(word in capacitor.kind.casefold() for word in _LEAKY_KINDS):
        return
    usual_a = max(0.01 * capacitor.value * design.supply.nominal, 3e-6)
    yield Concern(
        severity="warning",
        key=f"stage.{stage.name}.C",
        text=(
            f"C is {capacitor.kind} and its leakage is not stated: the limits are computed without "
            f"one. Data sheets commonly permit 0.01·C·V or 3 µA, here "
            f"{format_value(usual_a, 'A', 2)}; a capacitor in use mostly leaks far less."
        ),
        hint='State it: C = { value = ..., leakage = "..." }.',
    )
