"""Results: solution, checks, verdict and the analysis that reports and records take."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

from benchtool.model.arrays import FloatArray
from benchtool.model.capture import Role, StructurePoint
from benchtool.model.quantity import Measured, Notice, Quantity
from benchtool.model.timing import Dropped, Intervals, Jitter, Levels, StabilityPoint, Timing

if TYPE_CHECKING:
    from benchtool.model.design import Design, Rule, Stage

VerdictName = Literal[
    "pass", "conditional-pass", "conditional-fail", "undecided", "fail", "unusable"
]

WORST_FIRST: tuple[VerdictName, ...] = (
    "fail",
    "unusable",
    "undecided",
    "conditional-fail",
    "conditional-pass",
    "pass",
)
"""Verdicts in the order in which one outweighs another."""


@dataclass(frozen=True, slots=True, kw_only=True)
class PartEstimate:
    """A part value under a stated assumption.

    Attributes:
        ref: RA, RB, R or C.
        nominal: Design value in SI units, None where there is no design.
        estimate: The value that the times give, under ``assumes``.
        change: Relative change against nominal, unit 1.
        assumes: What was taken as known, in words.
        within_tolerance: True or False where the interval decides, else None.
    """

    ref: str
    nominal: float | None
    estimate: Measured | None
    change: Measured | None
    assumes: tuple[str, ...]
    within_tolerance: bool | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Solution:
    """What the times say of the circuit: products of the parts alone, and the effective ones.

    ``tau_charge`` is (RA+RB)·C and ``tau_discharge`` RB·C for the astable; RA·C and RB·C with a
    steering diode; R·C both for the topologies with one resistor.
    """

    topology: str
    tau_charge: Measured | None = None
    tau_discharge: Measured | None = None
    tau_RA: Measured | None = None
    tau_ratio: Measured | None = None
    effective_charge: Measured | None = None
    effective_discharge: Measured | None = None
    parts: tuple[PartEstimate, ...] = ()
    warnings: tuple[Notice, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Check:
    """One quantity held against its limits.

    ``accept_lower`` and ``accept_upper`` are the limits drawn in by the guard band; both None
    where nothing is left between them. ``reason`` is one sentence; ``warnings`` concern this
    check alone.
    """

    quantity: str
    measured: Quantity | None
    lower: float | None
    upper: float | None
    unit: str
    accept_lower: float | None
    accept_upper: float | None
    source: str
    p_conform: float | None
    verdict: VerdictName
    reason: str
    nominal: float | None = None
    warnings: tuple[Notice, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Change:
    """How a quantity changed since the baseline: relative, unit 1, with its uncertainty."""

    quantity: str
    before: Measured
    change: Measured
    significant: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class Finding:
    """Something seen in the trace, and the faults that can cause it."""

    code: str
    text: str
    may_be: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Gap:
    """A hole in a trace, seconds after its start."""

    start_s: float
    end_s: float


@dataclass(frozen=True, slots=True, kw_only=True)
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


@dataclass(frozen=True, slots=True, kw_only=True)
class IntervalCounts:
    """How many complete intervals there were, and what was dropped."""

    high: int
    low: int
    period: int
    dropped: tuple[Dropped, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Overview:
    """Enough of the trace to draw it without its samples.

    Attributes:
        envelope_s: Bin times of the first cycles, shape (n,), n <= 2000.
        envelope_low_v, envelope_high_v: Least and greatest sample of each bin, shape (n,).
        edges_s: Edges inside the envelope's time range, shape (m,).
        histogram_s: Bin limits of the periods, shape (k+1,).
        histogram_count: Periods a bin, shape (k,).
        periods_at_s, periods_s: At most 500 periods over time, shape (p,) each.
    """

    envelope_s: FloatArray
    envelope_low_v: FloatArray
    envelope_high_v: FloatArray
    edges_s: FloatArray
    histogram_s: FloatArray
    histogram_count: FloatArray
    periods_at_s: FloatArray
    periods_s: FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class Source:
    """A file that went into an analysis."""

    role: str
    name: str
    sha256: str
    format: str
    structure: tuple[StructurePoint, ...] = ()
    start_ns: int | None = None
    instrument: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Flat:
    """A record without an edge: its length, and its state where that is known."""

    length_s: float
    state: Literal["high", "low"] | None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class StageResult:
    """All that was found for one stage, or for the one trace measured without a design.

    ``trace`` is None where plain figures were given in place of a capture; ``source`` is the
    index of the file in the analysis. ``likely`` is one sentence that names the likeliest
    part; ``series`` the intervals themselves; ``flat`` is set where there is no edge.
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
    series: Intervals | None = None
    flat: Flat | None = None
    design: Stage | None = None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
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
    warnings: tuple[Notice, ...] = ()
