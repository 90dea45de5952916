"""Part values under a stated assumption."""

from __future__ import annotations

import math
from collections.abc import Mapping

from benchtool.circuits.circuit import Circuit, Value
from benchtool.circuits.fit import Disagreement, Fit, Output, fit
from benchtool.circuits.observations import Observation
from benchtool.circuits.topologies import find_topology
from benchtool.circuits.unknowns import part_model
from benchtool.errors import SolveError
from benchtool.model.design import REFERENCE_TEMPERATURE_C, Design, Part, Stage
from benchtool.model.judgement import PartEstimate
from benchtool.model.quantity import Measured
from benchtool.uncertainty import expanded
from benchtool.units import format_value

_AGREEMENT_REL = 1e-6  # differences of computed times below this are rounding


def contradicts(surplus: Disagreement | None) -> bool:
    """Say whether a difference that should be zero lies beyond its expanded uncertainty."""
    if surplus is None:
        return False
    reach = expanded(surplus.difference) + _AGREEMENT_REL
    return abs(surplus.difference.value) > reach


def estimate_by_marking(
    stage: Stage, design: Design, observations: tuple[Observation, ...]
) -> tuple[PartEstimate, ...]:
    """Estimate each part, all others being as marked within their tolerance.

    Returns:
        One entry a part; no estimate where the times contradict the assumption.
    """
    refs = find_topology(stage.topology).parts
    return tuple(_one_by_marking(ref, stage, design, observations) for ref in refs)


def _one_by_marking(
    ref: str, stage: Stage, design: Design, observations: tuple[Observation, ...]
) -> PartEstimate:
    refs = find_topology(stage.topology).parts
    assumes = tuple(_as_toleranced(stage.parts[item]) for item in refs if item != ref)
    part = stage.parts[ref]
    try:
        found = fit(part_model(stage, design, (ref,), {}), observations, (math.log(part.value),))
    except SolveError:
        return _entry(part, None, assumes)
    return _entry(part, None if contradicts(found.disagreement()) else found, assumes)


def estimate_from_known(
    stage: Stage,
    design: Design,
    observations: tuple[Observation, ...],
    known: Mapping[str, float],
    *,
    marked: bool,
) -> tuple[PartEstimate, ...]:
    """Estimate the parts that are not known from those that are.

    Args:
        stage: The circuit.
        design: Its supply, temperature and probe.
        observations: The measured times.
        known: Values of known parts by reference.
        marked: Whether the stage's own part values are a design to compare with.

    Returns:
        One entry an unknown part; none where the times are too few for them.
    """
    topology = find_topology(stage.topology)
    unknown = tuple(ref for ref in topology.parts if ref not in known)
    determined = min(len(topology.resistor_refs), len(observations))
    if not 0 < len(unknown) <= determined:
        return ()
    start = tuple(math.log(stage.parts[ref].value) for ref in unknown)
    found = fit(part_model(stage, design, unknown, known), observations, start)
    tenable = None if contradicts(found.disagreement()) else found
    assumes = tuple(_as_marked(ref, value) for ref, value in known.items())
    return tuple(_entry(stage.parts[ref], tenable, assumes, marked=marked) for ref in unknown)


def _entry(
    part: Part, found: Fit | None, assumes: tuple[str, ...], *, marked: bool = True
) -> PartEstimate:
    nominal = part.value if marked else None
    if found is None:
        return PartEstimate(
            ref=part.ref,
            nominal=nominal,
            estimate=None,
            change=None,
            assumes=assumes,
            within_tolerance=None,
        )
    estimate = found.carry(_part_value(part, found), "F" if part.ref == "C" else "ohm")
    change = _change(estimate, part.value) if marked else None
    return PartEstimate(
        ref=part.ref,
        nominal=nominal,
        estimate=estimate,
        change=change,
        assumes=assumes,
        within_tolerance=_within(change, part) if change else None,
    )


def _part_value(part: Part, found: Fit) -> Output:
    """Return the part's value at the reference temperature, to which its tolerance refers."""
    warmth_k = found.model.design.temperature.nominal - REFERENCE_TEMPERATURE_C
    factor = 1 + part.tempco_per_k * warmth_k

    def output(circuit: Circuit) -> Value:
        value: Value = getattr(circuit, part.ref)
        return value / factor

    return output


def _change(estimate: Measured, nominal: float) -> Measured:
    scaled = tuple(item.scaled(1 / nominal) for item in estimate.budget)
    return Measured(
        value=estimate.value / nominal - 1,
        u=estimate.u / nominal,
        unit="1",
        dof=estimate.dof,
        n=estimate.n,
        budget=scaled,
    )


def _within(change: Measured, part: Part) -> bool | None:
    """Decide with U: inside, outside, or not to be said."""
    reach = expanded(change)
    lowest, highest = change.value - reach, change.value + reach
    if part.lower_rel <= lowest and highest <= part.upper_rel:
        return True
    return False if highest < part.lower_rel or lowest > part.upper_rel else None


def _as_marked(ref: str, value: float) -> str:
    return f"{ref} as marked {format_value(value, 'F' if ref == 'C' else 'ohm')}"


def _as_toleranced(part: Part) -> str:
    stated = _as_marked(part.ref, part.value)
    if part.upper_rel == part.lower_rel:
        return stated
    if math.isclose(part.upper_rel, -part.lower_rel):
        return f"{stated} ± {100 * part.upper_rel:.3g} %"
    return f"{stated} {100 * part.lower_rel:+.3g} % {100 * part.upper_rel:+.3g} %"
