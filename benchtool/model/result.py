"""Results: a stage, and the analysis that reports and records take."""

from __future__ import annotations

from typing import TYPE_CHECKING, Literal

from benchtool.frozen import frozen_record
from benchtool.model.capture import Role, StructurePoint
from benchtool.model.quantity import Notice
from benchtool.model.timing import (
    Dropped,
    Edges,
    Intervals,
    Jitter,
    Levels,
    StabilityPoint,
    Timing,
)

if TYPE_CHECKING:
    from benchtool.model.counted import Counted
    from benchtool.model.design import Design, Rule, Stage
    from benchtool.model.diagnosis import Diagnosis
    from benchtool.model.judgement import Change, Check, Solution, VerdictName
    from benchtool.model.kit import KitInstrument
    from benchtool.model.node import EarlyTau, NodeFit
    from benchtool.model.overview import Overview
    from benchtool.model.picking import Combinations
    from benchtool.model.window import Window


@frozen_record
class Gap:
    """A hole in a trace, seconds after its start."""

    start_s: float
    end_s: float


@frozen_record
class TraceFacts:
    """What is said of the trace that was measured."""

    channel: str
    role: Role
    kind: Literal["waveform", "logic"]
    samples: int | None
    sample_interval_s: float | None
    tick_s: float | None
    start_s: float
    duration_s: float
    gaps: tuple[Gap, ...] = ()


@frozen_record
class IntervalCounts:
    """How many complete intervals there were, and what was dropped."""

    high: int
    low: int
    period: int
    dropped: tuple[Dropped, ...] = ()


@frozen_record
class Source:
    """A file that went into an analysis.

    ``window`` is the part of it that was taken, where not all; ``options`` are the words by which
    the user said how to read it.
    """

    role: str
    name: str
    sha256: str
    format: str
    structure: tuple[StructurePoint, ...] = ()
    start_ns: int | None = None
    instrument: str | None = None
    window: Window | None = None
    options: tuple[str, ...] = ()


@frozen_record
class Flat:
    """A record without an edge: its length, and its state where that is known."""

    length_s: float
    state: Literal["high", "low"] | None


@frozen_record
class Finding:
    """Something seen in the trace, and the faults that can cause it."""

    code: str
    text: str
    may_be: tuple[str, ...] = ()


@frozen_record(eq=False)
class StageResult:
    """All that was found for one stage, or for the one trace measured without a design.

    ``trace`` is None where plain figures were given in place of a capture; ``source`` is the
    index of the file in the analysis; ``counted`` holds a counter's readings, which have no trace
    either. ``likely`` is one sentence that names the likeliest
    part; ``edges`` and ``series`` are the edges and the intervals themselves; ``flat`` is set
    where there is no edge.
    """

    source: int
    stage: str | None
    trace: TraceFacts | None
    levels: Levels | None = None
    intervals: IntervalCounts | None = None
    timing: Timing | None = None
    jitter: Jitter | None = None
    stability: tuple[StabilityPoint, ...] = ()
    solution: Solution | None = None
    checks: tuple[Check, ...] = ()
    verdict: VerdictName | None = None
    likely: str | None = None
    changes: tuple[Change, ...] = ()
    findings: tuple[Finding, ...] = ()
    warnings: tuple[Notice, ...] = ()
    overview: Overview | None = None
    edges: Edges | None = None
    series: Intervals | None = None
    flat: Flat | None = None
    design: Stage | None = None
    diagnosis: Diagnosis | None = None
    counted: Counted | None = None
    node: NodeFit | None = None
    early: EarlyTau | None = None
    combinations: Combinations | None = None


@frozen_record(eq=False)
class Analysis:
    """One run of benchtool: the one thing that reports and records take."""

    command: str
    sources: tuple[Source, ...]
    results: tuple[StageResult, ...]
    verdict: VerdictName | None = None
    rule: Rule | None = None
    design: Design | None = None
    timebase_rel: float | None = None
    timebase_from: str = ""
    instrument: KitInstrument | None = None
    warnings: tuple[Notice, ...] = ()
