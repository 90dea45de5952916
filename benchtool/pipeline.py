"""The whole way of the data, each verb stopping where its question is answered.

::

    format -> Capture -> Levels -> Edges -> Intervals -> Timing -> Solution -> Verdict

``observation`` goes as far as Timing, ``assessment`` from there. Measuring needs neither circuits
nor designs, so these are imported where they are used.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import replace
from types import MappingProxyType
from typing import TYPE_CHECKING

from benchtool.intake import CaptureSource, FilePath, observe_all, observe_lineup, take, times_of
from benchtool.model.capture import Capture
from benchtool.model.options import MeasureOptions
from benchtool.model.quantity import Notice
from benchtool.model.result import Analysis
from benchtool.model.timing import Timing
from benchtool.observation import glance, settle
from benchtool.provenance import source_of, warnings_of
from benchtool.targets import Target, find_channel, line_up
from benchtool.undrawn import diagnose_unmarked, solve_early, solve_topology

if TYPE_CHECKING:
    from benchtool.evidence import Companion
    from benchtool.model.design import Design
    from benchtool.model.diagnosis import Reading
    from benchtool.model.result import StageResult
    from benchtool.observation import Settings

__all__ = [
    "analyse",
    "diagnose",
    "diagnose_unmarked",
    "look",
    "measure",
    "solve",
    "solve_early",
    "solve_topology",
]

DEFAULTS = MeasureOptions()
MOST_LISTED = 64
"""Traces of a file that ``look`` lists; it counts the others."""
NOTHING_KNOWN: Mapping[str, float] = MappingProxyType({})


def look(sources: Sequence[CaptureSource], *, options: MeasureOptions = DEFAULTS) -> Analysis:
    """Say what captures hold: structure with its evidence, traces, roles, levels.

    Args:
        sources: The captures, or their files; ``-`` is standard input.
        options: What is overruled.

    Returns:
        One result a trace, at most 64 a file, each with the number of its source; no figure is
        made of them.

    Raises:
        InputError: If a file cannot be opened.
        CaptureError: If one holds no capture, or could be read in two ways.
        UsageError: If one has no channel of the name given (``no-such-channel``).
    """
    settings = settle(options, None)
    captures = [take(source, options) for source in sources]
    results = tuple(
        replace(glance(Target(shape=lineup.shapes[i], role=lineup.roles[i]), settings), source=k)
        for k, lineup in enumerate(map(line_up, captures))
        for i in _listed(lineup.capture, options.read.channel or lineup.capture.channel)
    )
    return Analysis(
        command="look",
        sources=tuple(source_of(capture, options) for capture in captures),
        results=results,
        warnings=(*warnings_of(captures, options), *_unlisted(captures, options)),
    )


def _listed(capture: Capture, channel: str | None) -> Sequence[int]:
    """Return which traces ``look`` lists: the one that was named, or the first ones."""
    if channel is not None:
        return (find_channel(capture, channel),)
    return range(min(len(capture.traces), MOST_LISTED))


def _unlisted(captures: Sequence[Capture], options: MeasureOptions) -> Iterator[Notice]:
    """Count the traces that ``look`` leaves out without having been told to."""
    for capture in captures:
        more = len(capture.traces) - MOST_LISTED
        if more > 0 and not (options.read.channel or capture.channel):
            text = f"{capture.origin.source} holds {more} more traces than are listed"
            yield Notice(code="traces-not-listed", text=text)


def measure(
    source: CaptureSource,
    *,
    baseline: CaptureSource | None = None,
    options: MeasureOptions = DEFAULTS,
) -> Analysis:
    """Measure the timing of a capture, and its change against a baseline where one is given.

    Args:
        source: The capture, or its file; ``-`` is standard input.
        baseline: An earlier capture of the same board.
        options: What is overruled.

    Returns:
        One result, for the trace that was chosen or could alone be meant.

    Raises:
        InputError: If a file cannot be opened.
        CaptureError: If one holds no capture, or could be read in two ways.
        UsageError: If several traces could be meant (``choose-channel``).
        MeasurementError: If one holds no complete interval; the message gives the bound.
    """
    analysis = observe_all(source, None, None, options, "measure")
    if baseline is None:
        return analysis
    from benchtool.comparison import compare_timing

    earlier = observe_all(baseline, None, None, options, "measure")
    now, before = analysis.results[0], earlier.results[0]
    changes = compare_timing(now.timing or Timing(), before.timing or Timing())
    return replace(
        analysis,
        sources=(*analysis.sources, replace(earlier.sources[0], role="baseline")),
        results=(replace(now, changes=changes),),
        warnings=tuple(dict.fromkeys((*analysis.warnings, *earlier.warnings))),
    )


def solve(
    source: CaptureSource | Timing,
    design: FilePath | Design,
    *,
    stage: str | None = None,
    known: Mapping[str, float] = NOTHING_KNOWN,
    options: MeasureOptions = DEFAULTS,
) -> Analysis:
    """Solve for the products of a designed circuit.

    Args:
        source: The capture, its file, ``-`` for standard input, or times already known.
        design: The design file, or the design.
        stage: Solve this stage alone; of plain times, the first where none is named.
        known: Reference of a part to its value in ohms or farads.
        options: What is overruled.

    Returns:
        One result a stage.

    Raises:
        SolveError: If the times are too few, or no parts of the topology give them.
        BenchtoolError: As ``measure`` and ``analyse``.
    """
    from benchtool.assessment import solve_stage
    from benchtool.designs.settling import settled_design

    intent = settled_design(design, options)
    analysis = times_of(source, intent, stage, options)
    return replace(
        analysis,
        results=tuple(solve_stage(item, intent, known=known) for item in analysis.results),
    )


def analyse(
    source: CaptureSource,
    design: FilePath | Design,
    *,
    stage: str | None = None,
    options: MeasureOptions = DEFAULTS,
) -> Analysis:
    """Take a capture the whole way, to a verdict against its design.

    Args:
        source: The capture, or its file; ``-`` is standard input.
        design: The design file, or the design.
        stage: Judge this stage alone.
        options: What is overruled.

    Returns:
        One result a stage; the verdict is the worst of them. A board that fails, or that is
        dead, is a result and not an error.

    Raises:
        BenchtoolError: As the tree in ``benchtool.errors`` says.
    """
    from benchtool.assessment import judge_board
    from benchtool.designs.settling import settled_design

    intent = settled_design(design, options)
    settings = settle(options, intent)
    analysis = observe_all(source, intent, stage, options, "judge")
    results, verdict = judge_board(analysis.results, intent, settings)
    return replace(analysis, results=results, verdict=verdict, rule=intent.rule)


def diagnose(
    source: CaptureSource,
    design: FilePath | Design,
    *,
    stage: str | None = None,
    companions: Sequence[Companion] = (),
    readings: Sequence[Reading] = (),
    node: FilePath | None = None,
    options: MeasureOptions = DEFAULTS,
) -> Analysis:
    """Rank what may have happened to a board, and name what to measure next.

    Args:
        source: The capture of the board as it is, or its file; ``-`` is standard input.
        design: The design file, or the design.
        stage: Diagnose this stage alone.
        companions: Further captures of the board, each with what was different.
        readings: Figures that were brought.
        node: A capture of the capacitor node; the main one gives it too where it holds it.
        options: What is overruled.

    Returns:
        One result a stage. A board that stands still is diagnosed too.

    Raises:
        BenchtoolError: As the tree in ``benchtool.errors`` says.
    """
    from benchtool.designs.settling import settled_design
    from benchtool.evidence import diagnose_stage
    from benchtool.mistakes import told_apart
    from benchtool.nodes import place_probe, read_node

    intent = settled_design(design, options)
    lineup = line_up(take(source, options))
    intent = place_probe(lineup, intent, settle(options, intent))
    main = observe_lineup(lineup, intent, stage, options, "diagnose")
    noded = lineup if node is None else line_up(take(node, options))
    settings = settle(options, intent)
    further = [
        (item, observe_all(item.source, intent, stage, options, "diagnose")) for item in companions
    ]
    told_apart(main, further, readings)
    results = tuple(
        diagnose_stage(
            result,
            [(item, _as_stated(item, seen.results[k], settings)) for item, seen in further],
            readings,
            intent,
            read_node(noded, result.design, intent, settings, apart=node is not None),
        )
        for k, result in enumerate(main.results)
    )
    sources = [replace(seen.sources[0], role=item.role) for item, seen in further]
    if noded is not lineup:
        sources.append(replace(source_of(noded.capture, options), role="node"))
    return replace(main, results=results, sources=(*main.sources, *sources))


def _as_stated(companion: Companion, result: StageResult, settings: Settings) -> StageResult:
    """Return what was observed in a further capture, read as what it is stated to be."""
    if companion.role != "power-up":
        return result
    from benchtool.powerups import with_first_high

    return with_first_high(result, settings)
