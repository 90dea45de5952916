"""The way for boards without a whole drawing, and for slopes that are not whole."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from types import MappingProxyType
from typing import TYPE_CHECKING

from benchtool.intake import CaptureSource, FilePath, take, times_of
from benchtool.model.options import MeasureOptions
from benchtool.model.quantity import Measured
from benchtool.model.result import Analysis
from benchtool.model.timing import Timing
from benchtool.observation import glance, settle
from benchtool.provenance import source_of, warnings_of
from benchtool.targets import Target, choose_stages, line_up

if TYPE_CHECKING:
    from benchtool.model.design import Design, Ic, TopologyName

DEFAULTS = MeasureOptions()
NOTHING_KNOWN: Mapping[str, float] = MappingProxyType({})


def solve_topology(
    source: CaptureSource | Timing,
    topology: TopologyName,
    *,
    ic: Ic | None = None,
    supply_v: float | None = None,
    known: Mapping[str, float] = NOTHING_KNOWN,
    options: MeasureOptions = DEFAULTS,
) -> Analysis:
    """Solve for the products where there is no design.

    Args:
        source: The capture, its file, ``-`` for standard input, or times already known.
        topology: The circuit.
        ic: Family and thresholds; a CMOS timer is assumed, with a notice, where none is given.
        supply_v: Supply in volts, where known.
        known: Reference of a part to its value in ohms or farads.
        options: What is overruled.

    Returns:
        One result.

    Raises:
        SolveError: If the times are too few, or no parts of the topology give them.
        BenchtoolError: As ``measure``.
    """
    from benchtool.assessment import solve_plain

    analysis = times_of(source, None, None, options)
    solved = solve_plain(analysis.results[0], topology, ic=ic, supply_v=supply_v, known=known)
    return replace(analysis, results=(solved,))


def solve_early(
    source: CaptureSource,
    end: Measured,
    design: FilePath | Design | None = None,
    *,
    stage: str | None = None,
    options: MeasureOptions = DEFAULTS,
) -> Analysis:
    """Solve a part of one slope of the capacitor node, whose end voltage is known.

    Args:
        source: The capture, or its file; ``-`` is standard input.
        end: Voltage to which the slope would settle, with its u.
        design: Gives the thresholds, from which the length of the whole slope follows.
        stage: Of which stage of the design.
        options: What is overruled.

    Returns:
        One result, with its early answer.

    Raises:
        MeasurementError: If the slope is too short for an answer, or beyond its end.
        BenchtoolError: As ``measure``.
    """
    from benchtool.designs.settling import settled_design
    from benchtool.early import early_answer

    intent = settled_design(design, options) if design is not None else None
    chosen = choose_stages(intent, stage)[0] if intent is not None else None
    lineup, settings = line_up(take(source, options)), settle(options, intent)
    early, index = early_answer(lineup, end, intent, chosen, settings)
    seen = glance(Target(shape=lineup.shapes[index], role="capacitor", stage=chosen), settings)
    result = replace(seen, early=early, warnings=(*seen.warnings, *early.warnings))
    return Analysis(
        command="solve",
        sources=(source_of(lineup.capture, options),),
        results=(result,),
        design=intent,
        timebase_rel=settings.timebase_rel,
        timebase_from=settings.timebase_from,
        warnings=warnings_of([lineup.capture], options),
    )


def diagnose_unmarked(
    source: CaptureSource,
    topology: TopologyName,
    *,
    ic: Ic | None = None,
    options: MeasureOptions = DEFAULTS,
) -> Analysis:
    """Say what can be said of a board without a drawing and without markings.

    Args:
        source: The capture, or its file; ``-`` is standard input.
        topology: The circuit.
        ic: Family of the IC; a CMOS timer is assumed, with a notice, where none is given.
        options: What is overruled.

    Returns:
        One result: the products, and the preferred values that could give them.

    Raises:
        BenchtoolError: As ``solve_topology``.
    """
    from benchtool.assessment import combine_parts

    solved = solve_topology(source, topology, ic=ic, options=options)
    return replace(solved, command="diagnose", results=tuple(map(combine_parts, solved.results)))
