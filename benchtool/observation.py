"""What one trace shows: levels, edges, intervals, and the figures made of them."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace
from itertools import pairwise
from typing import TYPE_CHECKING, Any

from benchtool.diagnose import find_findings, flat_length, flat_state
from benchtool.frozen import frozen_record
from benchtool.model.capture import LogicTrace, Trace, UniformTime, Waveform
from benchtool.model.options import JITTER_REL, TIMEBASE_REL, MeasureOptions
from benchtool.model.quantity import Measured, Notice, Quantity
from benchtool.model.result import Flat, Gap, IntervalCounts, StageResult, TraceFacts
from benchtool.model.timing import Edges, Intervals, Levels, Timing
from benchtool.targets import Target
from benchtool.timing import (
    Shape,
    find_edges,
    find_intervals,
    find_levels,
    find_turning_points,
    make_overview,
    measure_delay,
    measure_jitter,
    measure_stability,
    measure_timing,
    require_intervals,
    require_states,
)

if TYPE_CHECKING:
    from benchtool.model.design import Design


@frozen_record
class Settings:
    """What a measurement needs to know besides the trace, each settled once.

    Attributes:
        timebase_rel: Half-width of the timebase error, relative.
        timebase_from: Where that figure comes from, in a word or two.
        jitter_rel: Assumed jitter where one interval is all there is, relative half-width.
        options: What the user overrules.
    """

    timebase_rel: float
    timebase_from: str
    jitter_rel: float
    options: MeasureOptions


def settle(options: MeasureOptions, design: Design | None) -> Settings:
    """Return the settings: an option wins, then the kit, then the design, then the default."""
    kept = options.instrument
    instrument = design.instrument if design else None
    stated = instrument.timebase_rel if instrument else None
    if options.timebase_rel is not None:
        timebase_rel, source = options.timebase_rel, "option --timebase"
    elif kept is not None and kept.timebase_rel is not None:
        timebase_rel, source = kept.timebase_rel, f"{kept.name} of the kit"
    elif stated is not None:
        timebase_rel, source = stated, "[instrument] of the design"
    else:
        timebase_rel, source = TIMEBASE_REL, "default"
    assumed = instrument.jitter_rel if instrument else None
    jitter_rel = next((x for x in (options.jitter_rel, assumed) if x is not None), JITTER_REL)
    return Settings(
        timebase_rel=timebase_rel, timebase_from=source, jitter_rel=jitter_rel, options=options
    )


@frozen_record(eq=False)
class _Seen:
    """A trace as far as its intervals."""

    levels: Levels | None
    edges: Edges
    intervals: Intervals


def glance(target: Target, settings: Settings) -> StageResult:
    """Take one trace as far as its levels and intervals; no figure is made of them."""
    seen = _see(target, settings)
    return _result(target, seen, (seen.edges.warnings, seen.intervals.warnings))


def observe(
    target: Target, settings: Settings, design: Design | None = None, *, required: bool = False
) -> StageResult:
    """Take one trace from its samples to its figures; a dead trace gives bounds.

    Args:
        target: The trace, its role and its stage.
        settings: As settled for this run.
        design: Gives the supply, by which a flat trace is high or low.
        required: Whether a trace without one complete interval is an error.

    Raises:
        MeasurementError: Where ``required``: ``flat-trace``, ``noise-only``, ``no-interval`` or
            ``under-sampled``.
    """
    seen = _see(target, settings)
    levels, edges, intervals = seen.levels, seen.edges, seen.intervals
    if required and levels is not None:
        require_states(levels)
    timing = _timing(target, edges, intervals, settings)
    if required and not isinstance(timing.delay, Measured):  # a delay needs no second edge
        require_intervals(intervals, edges)
    jitter = measure_jitter(intervals, edges)
    supply_v = design.supply.nominal if design else None
    topology = target.stage.topology if target.stage else None
    return replace(
        _result(target, seen, (x.warnings for x in (edges, intervals, timing, jitter))),
        timing=timing,
        jitter=jitter,
        stability=measure_stability(intervals),
        findings=find_findings(
            levels, edges, intervals, timing, supply_v=supply_v, topology=topology
        ),
        flat=_flat(levels, edges, supply_v),
    )


def _see(target: Target, settings: Settings) -> _Seen:
    """Take a trace as far as its intervals, with what is known of it from finding its role."""
    shape, active = target.shape, settings.options.active
    known = shape.levels is not None and settings.options.level_v is None
    levels = shape.levels if known else _levels(shape.trace, settings)
    if levels is not None and target.role == "capacitor" and isinstance(shape.trace, Waveform):
        edges = find_turning_points(shape.trace, levels)
    elif shape.edges is not None and levels is shape.levels:
        edges = shape.edges
    else:
        edges = find_edges(shape.trace, levels)
    active = active or (target.stage.active if target.stage else "high")
    if target.stage and target.stage.topology == "one-shot" and active == "low":
        edges, active = edges.inverted(), "high"  # t_high is the pulse, whichever way it goes
    powered = target.supply if target.role == "output" else None
    powered_s = powered.comes_up_s if powered else None
    intervals = find_intervals(edges, active=active, powered_s=powered_s)
    return _Seen(levels=levels, edges=edges, intervals=intervals)


def _result(target: Target, seen: _Seen, warnings: Iterable[tuple[Notice, ...]]) -> StageResult:
    return StageResult(
        source=0,
        stage=target.stage.name if target.stage else None,
        design=target.stage,
        trace=_facts(target, seen.edges),
        levels=seen.levels,
        intervals=_counts(seen.intervals),
        warnings=tuple(dict.fromkeys((*target.warnings, *(x for some in warnings for x in some)))),
        overview=make_overview(target.shape.trace, seen.edges, seen.intervals),
        edges=seen.edges,
        series=seen.intervals,
    )


def _timing(target: Target, edges: Edges, intervals: Intervals, settings: Settings) -> Timing:
    timing = measure_timing(
        intervals, edges, timebase_rel=settings.timebase_rel, jitter_rel=settings.jitter_rel
    )
    topology = target.stage.topology if target.stage else None
    if topology == "power-on":
        return replace(timing, **_power_on_delay(target, edges, timing, settings))
    if topology == "one-shot" and target.trigger is not None:
        return replace(timing, delay=_delay(target.trigger, edges, settings))
    return timing


def _power_on_delay(
    target: Target, edges: Edges, timing: Timing, settings: Settings
) -> dict[str, Any]:
    """Return the delay after the supply came up; without its trace, a single whole high time."""
    if target.supply is not None:
        return {"delay": _delay(target.supply, edges, settings, powers=True)}
    if not isinstance(timing.t_high, Measured):
        return {}
    notice = Notice(
        code="assumed-delay-from-output",
        text="no trace shows the supply coming up: the delay is taken as the output's high time",
    )
    return {"delay": timing.t_high, "warnings": (*timing.warnings, notice)}


def _delay(
    start: Shape, answer: Edges, settings: Settings, *, powers: bool = False
) -> Quantity | None:
    if start.edges is None:
        return None
    return measure_delay(
        start.edges,
        answer,
        timebase_rel=settings.timebase_rel,
        jitter_rel=settings.jitter_rel,
        powers=powers,
    )


def _levels(trace: Trace, settings: Settings) -> Levels | None:
    if isinstance(trace, LogicTrace):
        return None
    return find_levels(trace, level_v=settings.options.level_v)


def _counts(intervals: Intervals) -> IntervalCounts:
    return IntervalCounts(
        high=intervals.high_s.size,
        low=intervals.low_s.size,
        period=intervals.period_s.size,
        dropped=intervals.dropped,
    )


def _flat(levels: Levels | None, edges: Edges, supply_v: float | None) -> Flat | None:
    length_s = flat_length(edges)
    if length_s is None:
        return None
    return Flat(length_s=length_s, state=flat_state(levels, edges, supply_v))


def _facts(target: Target, edges: Edges) -> TraceFacts:
    trace = target.shape.trace
    interval_s = _interval(trace)
    return TraceFacts(
        channel=trace.channel,
        role=target.role,
        kind="logic" if not isinstance(trace, Waveform) or trace.is_logic else "waveform",
        samples=trace.samples.size if isinstance(trace, Waveform) else None,
        sample_interval_s=interval_s,
        tick_s=_tick(trace),
        start_s=edges.runs[0].start_s if edges.runs else 0.0,
        duration_s=_duration(edges, interval_s) or _length(trace),
        gaps=tuple(
            Gap(start_s=before.end_s, end_s=after.start_s)
            for before, after in pairwise(edges.runs)
            if after.start_s > before.end_s
        ),
    )


def _interval(trace: Trace) -> float | None:
    if isinstance(trace, Waveform) and isinstance(trace.time, UniformTime):
        return trace.time.dt_s
    return None


def _tick(trace: Trace) -> float | None:
    if isinstance(trace, LogicTrace):
        return trace.tick_s or None
    return _interval(trace) if trace.is_logic else None


def _length(trace: Trace) -> float:
    """Return N·dt of a trace in which nothing was looked for, such as a part of one slope."""
    interval_s = _interval(trace)
    return trace.samples.size * interval_s if interval_s and isinstance(trace, Waveform) else 0.0


def _duration(edges: Edges, interval_s: float | None) -> float:
    """Return N·dt: each run ends one interval after its last sample; 0 where none has a length."""
    lengths_s = [run.end_s - run.start_s for run in edges.runs]
    return sum(lengths_s) + len(lengths_s) * (interval_s or 0.0) if any(lengths_s) else 0.0
