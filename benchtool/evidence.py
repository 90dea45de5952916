"""From captures and a technician's readings to the evidence that a diagnosis takes."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace

from benchtool.diagnose import diagnose
from benchtool.diagnose.priors import DEFAULT_PRIORS, Priors
from benchtool.frozen import frozen_record
from benchtool.mistakes import refuse_short, refuse_stopping, unused_notices
from benchtool.model.design import Design
from benchtool.model.diagnosis import Evidence, Observation, ObservationRole, Reading
from benchtool.model.result import StageResult
from benchtool.model.timing import Timing
from benchtool.nodes import NOTHING, NodeEvidence
from benchtool.sightings import further_findings, sentence_with


@frozen_record
class Companion:
    """A further capture of the board, and what was different when it was made.

    Attributes:
        role: What it is: power-up, shunt, added-capacitor, probe-lifted, supply, heated, baseline.
        source: The capture file.
        value, u: Of what was added or set, SI units; None where the role needs none.
        part: What was heated.
        same_board: For a baseline: whether it is the same board, earlier.
    """

    role: ObservationRole
    source: str
    value: float | None = None
    u: float = 0.0
    part: str | None = None
    same_board: bool = True


_TOLD = ("no-first-high",)
"""Of what was seen in a further capture, what bears on the diagnosis as a whole."""

_LOADED_WEIGHT = 3.0
"""Of a probe that loads the node, where one was seen on it and nothing is stated: assumed."""


def _priors(node: NodeEvidence) -> Priors:
    """Return what is held beforehand: a probe that was seen on the node is a likely load."""
    if not node.is_loaded:
        return DEFAULT_PRIORS
    table = dict(DEFAULT_PRIORS.table)
    table["probe-load"] = replace(table["probe-load"], weight=_LOADED_WEIGHT)
    return replace(DEFAULT_PRIORS, table=table)


def observation_of(result: StageResult, companion: Companion | None = None) -> Observation:
    """Return what one capture says to a diagnosis.

    Args:
        result: What was observed in it.
        companion: What was different; None for the board as it is.
    """
    timing = result.timing or Timing()
    state = result.flat.state if result.flat else None
    if companion is None:
        return Observation(timing=timing, state=state)
    if companion.role == "power-up":
        timing = Timing(first_high=timing.first_high, delay=timing.delay)
    return Observation(
        role=companion.role,
        timing=timing,
        state=state,
        value=companion.value,
        u=companion.u,
        part=companion.part,
        same_board=companion.same_board,
    )


def diagnose_stage(
    result: StageResult,
    companions: Sequence[tuple[Companion, StageResult]],
    readings: Iterable[Reading],
    design: Design,
    node: NodeEvidence = NOTHING,
) -> StageResult:
    """Add the diagnosis of a stage.

    Args:
        result: What was observed of it, in the capture of the board as it is.
        companions: Further captures, and what was observed of the stage in each.
        readings: Figures that were brought.
        design: Its supply, temperature and probe.
        node: What a record of the capacitor node says.

    Raises:
        SolveError: If there is neither a time nor a standstill to diagnose.
    """
    if result.design is None:
        return result
    refuse_short(result, design)
    refuse_stopping(result.design, companions, design)
    further = (observation_of(seen, companion) for companion, seen in companions)
    brought = (*readings, *node.readings)
    evidence = Evidence(observations=(observation_of(result), *further), readings=brought)
    found = diagnose(evidence, result.design, design, priors=_priors(node))
    power_ups = [seen for companion, seen in companions if companion.role == "power-up"]
    is_healthy = found.best.fault == "healthy"
    findings, noted = further_findings(result, power_ups, brought, design, is_healthy=is_healthy)
    apart = [notice for _, seen in companions for notice in seen.warnings if notice.code in _TOLD]
    unused = unused_notices(result, companions, brought)
    warnings = (*result.warnings, *node.warnings, *unused, *apart, *noted, *found.warnings)
    return replace(
        result,
        diagnosis=replace(found, sentence=sentence_with(found, findings)),
        node=node.fit,
        findings=findings,
        warnings=tuple(dict.fromkeys(warnings)),
    )
