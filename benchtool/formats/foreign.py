"""Channels from arrays that another program saved under its own names."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import replace
from typing import Any

import numpy as np

from benchtool.errors import AmbiguousStructureError, MalformedCaptureError, UsageError
from benchtool.formats.clock import ClockScan
from benchtool.formats.content import Content
from benchtool.formats.grid import code_step
from benchtool.formats.overrules import idle_option
from benchtool.formats.steps import Steps, examine_steps
from benchtool.formats.stored import DerivedSamples, thinned
from benchtool.formats.text import unitwords, words
from benchtool.formats.text.timebase import ShiftedStamps, StatedInterval, Timebase, settle_time
from benchtool.formats.text.timeunit import named_unit
from benchtool.formats.text.unitwords import SECOND, TimeUnit
from benchtool.model.arrays import NDArray
from benchtool.model.capture import (
    ReadOptions,
    Samples,
    Scale,
    Span,
    StampedTime,
    StructurePoint,
    Sureness,
    Trace,
    UniformTime,
    Waveform,
)
from benchtool.model.quantity import Notice

Columns = Mapping[str, Samples]
Scalars = Mapping[str, NDArray[Any]]

_FIRST = 8192
"""Samples from which the step of codes is told."""
_VOLTS = Notice(
    code="assumed-volts",
    text="the arrays state no unit for their values: volts are assumed; only voltages "
    "depend on it, no time does",
)


def contradiction(content: Content, reason: str) -> MalformedCaptureError:
    """Return the error for arrays that do not fit together."""
    return MalformedCaptureError(
        f"the arrays of {content.source} contradict each other: {reason}",
        hint="The layout is described by `benchtool explain npz`.",
        path=content.source,
    )


def refuse_overruled_time(options: ReadOptions, content: Content) -> None:
    """Refuse options on the time of our own layout, which states it in seconds.

    Raises:
        UsageError: With code ``option-idle``.
    """
    for name in ("time", "time_unit"):
        if getattr(options, name) is not None:
            reason = "its arrays state their own time, in seconds"
            raise idle_option(name, content.source, reason, "Leave it out; --interval overrules.")


def foreign_traces(
    columns: Columns, scalars: Scalars, options: ReadOptions, content: Content
) -> tuple[tuple[Trace, ...], list[StructurePoint], tuple[Notice, ...]]:
    """Return the channels of another program's arrays.

    Args:
        columns: The rows of numbers by name.
        scalars: The single numbers by name.
        options: What the user overrules.
        content: The file.

    Raises:
        MalformedCaptureError: If none holds numbers (``no-values``).
    """
    if not columns:
        raise MalformedCaptureError(
            f"{content.source} holds no array of numbers",
            hint="Save the samples as a 1-D array of numbers.",
            path=content.source,
            code="no-values",
        )
    clock = _clock_name(columns, options, content)
    notices: tuple[Notice, ...] = ()
    traces: tuple[Trace, ...]
    if clock is None:
        traces, evidence = _counted_channels(columns, scalars, options, content)
    else:
        timebase, stamps, evidence, notices = _timed(columns[clock], clock, options, content)
        traces = _timed_channels(columns, clock, timebase, stamps, content)
    assumed = any(notice.code == "assumed-time-unit" for notice in notices)
    points = _time_points(traces[0], clock, evidence, assumed=assumed)
    return traces, points, (*notices, _VOLTS)


def _time_points(
    trace: Trace, clock: str | None, evidence: str, *, assumed: bool
) -> list[StructurePoint]:
    """Return what gives time, and the interval where it is even."""
    sure: Sureness = "assumed" if assumed else "stated"
    points = [StructurePoint(name="time", value=clock or "none", evidence=evidence, sure=sure)]
    interval = getattr(trace, "time", None)
    if isinstance(interval, UniformTime):
        shown, sure = f"{interval.dt_s:.9g} s", "measured" if clock else "stated"
        points.append(StructurePoint(name="interval", value=shown, evidence=evidence, sure=sure))
    return points


def _counted_channels(
    columns: Columns, scalars: Scalars, options: ReadOptions, content: Content
) -> tuple[tuple[Trace, ...], str]:
    """Return the channels of arrays none of which gives time, and what the interval is from."""
    if options.time_unit is not None:
        raise idle_option(
            "time_unit", content.source, "no array gives time", "Name the array with --time."
        )
    dt_s, evidence = _interval(scalars, options, content)
    traces = tuple(
        _channel(name, a, UniformTime(dt_s=dt_s), (Span(start=0, stop=a.size, start_s=0.0),))
        for name, a in columns.items()
    )
    return traces, evidence


def _clock_name(columns: Columns, options: ReadOptions, content: Content) -> str | None:
    """Return the array that gives time: by its name, or the first of a table if it rises."""
    if options.time is not None:
        return _named_clock(columns, options.time, content)
    for name in columns:
        if words.is_time_name(words.split_unit(name)[0]):
            return name
    first = next(iter(columns))
    return first if len(columns) > 1 and first == "column 1" and _rises(columns[first]) else None


def _rises(samples: Samples) -> bool:
    before: NDArray[Any] = np.empty(0, samples.dtype)
    for block in samples.blocks():
        joined: NDArray[Any] = np.concatenate([before, block])
        if not (joined[1:] > joined[:-1]).all():
            return False
        before = joined[-1:]
    return bool(np.isfinite(before).all())


def _named_clock(columns: Columns, name: str, content: Content) -> str | None:
    """Return the array that the user names or numbers; ``none`` counts the samples."""
    if name.casefold() == "none":
        return None
    names = list(columns)
    found = [each for each in names if each.casefold() == name.strip().casefold()]
    if not found and name.isdecimal() and 1 <= int(name) <= len(names):
        found = [names[int(name) - 1]]
    if len(found) == 1:
        return found[0]
    there = ", ".join(f"{i + 1} {each}" for i, each in enumerate(names[:16]))
    raise UsageError(
        f"{content.source} has no array {name!r}",
        hint=f"--time takes: {there}, or none.",
        code="no-such-column",
    )


def _interval(scalars: Scalars, options: ReadOptions, content: Content) -> tuple[float, str]:
    if options.interval_s is not None:
        return options.interval_s, "--interval or --rate"
    for name, value in scalars.items():
        key, unit = words.split_unit(name)
        if value.size != 1 or value.dtype.kind not in "iuf" or not float(value.ravel()[0]) > 0:
            continue
        figure = float(value.ravel()[0])
        if words.is_rate_key(key):
            return 1 / (figure * (unitwords.rate_factor(unit) or 1.0)), f"array {name!r}"
        if words.is_interval_key(key):
            return (unitwords.time_unit(unit) or SECOND).seconds(figure), f"array {name!r}"
    raise AmbiguousStructureError(
        f"{content.source} holds samples, but neither times nor an interval",
        hint="Give --interval (such as 5us) or --rate (such as 200k).",
        code="no-time",
    )


def _timed(
    stamps: Samples, name: str, options: ReadOptions, content: Content
) -> tuple[Timebase, Samples, str, tuple[Notice, ...]]:
    """Settle the time of an array of stamps; return them in seconds after the first."""
    unit, evidence, notices = _array_unit(name, options)
    times, resolution = _from_first(stamps, content)
    steps = examine_steps(next(iter(times.blocks()))[:4096].astype(np.float64), resolution)
    scan = _scanned(times, steps, content)
    if steps.even and steps.coarse and scan.n_repeated and not scan.is_even():
        scan = _scanned(times, replace(steps, even=False), content)  # they repeat for no grid
    given = StatedInterval(value_s=options.interval_s) if options.interval_s else None
    timebase = settle_time(scan, unit, given)
    kept = DerivedSamples(base=times, derive=lambda block: block * unit.times / unit.over)
    return timebase, kept, evidence, (*notices, *timebase.warnings)


def _scanned(times: Samples, steps: Steps, content: Content) -> ClockScan:
    scan = ClockScan(steps, content.source)
    for block in times.blocks():
        scan.feed(block.astype(np.float64, copy=False))
    scan.finish()
    return scan


def _from_first(stamps: Samples, content: Content) -> tuple[Samples, float]:
    """Return stamps after the first, and the size of their last digit."""
    if stamps.dtype.kind != "f":
        first = next(iter(stamps.blocks(0, 1))).astype(np.int64)[0]
        whole = DerivedSamples(
            base=stamps, derive=lambda block: (block.astype(np.int64) - first).astype(np.float64)
        )
        return whole, 1.0
    origin, largest = math.nan, 0.0
    for block in stamps.blocks():
        told = block[np.isfinite(block)]
        if told.size:
            origin = float(told[0]) if math.isnan(origin) else origin
            typical = float(np.median(np.abs(told)))  # one wild stamp says nothing of the others
            largest = max(largest, 2 * typical)
    if math.isnan(origin):
        raise contradiction(content, "no time stamp is a number")
    digit = float(np.spacing(stamps.dtype.type(largest)))
    return DerivedSamples(
        base=stamps, derive=lambda block: block.astype(np.float64) - origin
    ), digit


def _array_unit(name: str, options: ReadOptions) -> tuple[TimeUnit, str, tuple[Notice, ...]]:
    if options.time_unit is not None:
        return named_unit(options.time_unit), "--time-unit", ()
    unit = unitwords.time_unit(words.split_unit(name)[1] or name)
    if unit is not None:
        return unit, f"array {name!r}", ()
    notice = Notice(
        code="assumed-time-unit",
        text=f"the array {name!r} states no unit: seconds are assumed; another unit scales "
        "every time (--time-unit)",
    )
    return SECOND, f"array {name!r}, seconds assumed", (notice,)


def _timed_channels(
    columns: Columns, clock: str, timebase: Timebase, stamps: Samples, content: Content
) -> tuple[Trace, ...]:
    others = {name: samples for name, samples in columns.items() if name != clock}
    wrong = next((n for n, samples in others.items() if samples.size != stamps.size), None)
    if wrong is not None or not others:
        raise contradiction(content, f"{wrong or 'no array'} does not have one value for each time")
    time: UniformTime | StampedTime
    if timebase.uniform is not None:
        time = timebase.uniform
    else:
        kept = thinned(stamps, timebase.dropped)
        if any(timebase.shifts_s):
            starts = tuple(span.start for span in timebase.spans)
            kept = ShiftedStamps(stamps=kept, starts=starts, shifts_s=timebase.shifts_s)
        time = StampedTime(stamps=kept, resolution_s=timebase.resolution_s)
    return tuple(
        _channel(name, thinned(samples, timebase.dropped), time, timebase.spans)
        for name, samples in others.items()
    )


def _channel(
    name: str, samples: Samples, time: UniformTime | StampedTime, spans: tuple[Span, ...]
) -> Waveform:
    """Return one channel: booleans are logic, integers codes, floats volts."""
    scale, unit = Scale(), "V"
    if samples.dtype.kind == "b":
        samples = DerivedSamples(base=samples, derive=lambda block: block.astype(np.uint8))
        unit = "1"
    elif samples.dtype.kind in "iu":
        first: NDArray[Any] = next(iter(samples.blocks(0, _FIRST)))
        scale = Scale(step_v=code_step(first))
    return Waveform(
        samples=samples,
        scale=scale,
        time=time,
        spans=spans,
        channel="".join(c for c in name if c.isprintable()),
        unit=unit,
    )
