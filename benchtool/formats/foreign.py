"""Channels from arrays that another program saved under its own names."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from benchtool.errors import AmbiguousStructureError, MalformedCaptureError
from benchtool.formats.clock import ClockScan, examine_steps
from benchtool.formats.content import Content
from benchtool.formats.grid import code_step
from benchtool.formats.text import words
from benchtool.formats.text.metadata import split_unit
from benchtool.formats.text.timebase import ShiftedStamps, Timebase, settle_time
from benchtool.formats.text.timeunit import named_unit
from benchtool.formats.text.words import SECOND, TimeUnit
from benchtool.model.arrays import FloatArray, NDArray
from benchtool.model.capture import (
    ArraySamples,
    ReadOptions,
    Samples,
    Scale,
    Span,
    StampedTime,
    StructurePoint,
    Trace,
    UniformTime,
    Waveform,
)
from benchtool.model.quantity import Notice

Arrays = Mapping[str, NDArray[Any]]


def frozen(array: NDArray[Any]) -> NDArray[Any]:
    """Return a contiguous array that cannot be written to."""
    array = np.ascontiguousarray(array)
    array.flags.writeable = False
    return array


def contradiction(content: Content, reason: str) -> MalformedCaptureError:
    """Return the error for arrays that do not fit together."""
    return MalformedCaptureError(
        f"the arrays of {content.source} contradict each other: {reason}",
        hint="The layout is described by `benchtool explain npz`.",
        path=content.source,
    )


def foreign_traces(
    arrays: Arrays, options: ReadOptions, content: Content
) -> tuple[tuple[Trace, ...], list[StructurePoint], tuple[Notice, ...]]:
    """Return the channels of another program's arrays.

    Raises:
        MalformedCaptureError: If none holds numbers (``no-values``).
    """
    columns = {n: a.ravel() for n, a in arrays.items() if a.size > 1 and a.dtype.kind in "iufb"}
    if not columns:
        raise MalformedCaptureError(
            f"{content.source} holds no array of numbers",
            hint="Save the samples as a 1-D array of numbers.",
            path=content.source,
            code="no-values",
        )
    clock = _clock_name(columns)
    traces: tuple[Trace, ...]
    if clock is None:
        dt_s, evidence = _interval(arrays, options, content)
        traces = tuple(
            _channel(name, a, UniformTime(dt_s=dt_s), (Span(start=0, stop=a.size, start_s=0.0),))
            for name, a in columns.items()
        )
        notices: tuple[Notice, ...] = ()
    else:
        timebase, stamps, evidence, notices = _timed(columns[clock], clock, options, content)
        traces = _timed_channels(columns, clock, timebase, stamps, content)
    volts = Notice(
        code="assumed-volts",
        text="the arrays state no unit for their values: volts are assumed; only voltages "
        "depend on it, no time does",
    )
    point = StructurePoint(name="time", value=clock or "none", evidence=evidence)
    return traces, [point], (*notices, volts)


def _clock_name(columns: Arrays) -> str | None:
    """Return the array that gives time: by its name, or the first of a table if it rises."""
    for name in columns:
        if words.is_time_name(split_unit(name)[0]):
            return name
    first = next(iter(columns))
    rises = len(columns) > 1 and first == "column 1" and bool(np.all(np.diff(columns[first]) > 0))
    return first if rises else None


def _interval(arrays: Arrays, options: ReadOptions, content: Content) -> tuple[float, str]:
    if options.interval_s is not None:
        return options.interval_s, "--interval or --rate"
    for name, value in arrays.items():
        key, unit = split_unit(name)
        if value.size != 1 or value.dtype.kind not in "iuf" or not float(value.ravel()[0]) > 0:
            continue
        figure = float(value.ravel()[0])
        if words.is_rate_key(key):
            return 1 / (figure * (words.rate_factor(unit) or 1.0)), f"array {name!r}"
        if words.is_interval_key(key):
            return (words.time_unit(unit) or SECOND).seconds(figure), f"array {name!r}"
    raise AmbiguousStructureError(
        f"{content.source} holds samples, but neither times nor an interval",
        hint="Give --interval (such as 5us) or --rate (such as 200k).",
        code="no-time",
    )


def _timed(
    stamps: NDArray[Any], name: str, options: ReadOptions, content: Content
) -> tuple[Timebase, FloatArray, str, tuple[Notice, ...]]:
    """Settle the time of an array of stamps."""
    unit, evidence, notices = _array_unit(name, options)
    times = (stamps - stamps[0]).astype(np.float64)
    resolution = 1.0 if stamps.dtype.kind in "iu" else float(np.spacing(np.abs(stamps).max()))
    scan = ClockScan(examine_steps(times[:4096], resolution), content.source)
    scan.feed(times)
    scan.finish()
    if not scan.pieces:
        raise contradiction(content, "no time stamp is a number")
    timebase = settle_time(scan, unit, options.interval_s)
    return timebase, times * unit.times / unit.over, evidence, (*notices, *timebase.warnings)


def _array_unit(name: str, options: ReadOptions) -> tuple[TimeUnit, str, tuple[Notice, ...]]:
    if options.time_unit is not None:
        return named_unit(options.time_unit), "--time-unit", ()
    unit = words.time_unit(split_unit(name)[1] or name)
    if unit is not None:
        return unit, f"array {name!r}", ()
    notice = Notice(
        code="assumed-time-unit",
        text=f"the array {name!r} states no unit: seconds are assumed; another unit scales "
        "every time (--time-unit)",
    )
    return SECOND, f"array {name!r}, seconds assumed", (notice,)


def _timed_channels(
    columns: Arrays, clock: str, timebase: Timebase, stamps: FloatArray, content: Content
) -> tuple[Trace, ...]:
    others = {name: a for name, a in columns.items() if name != clock}
    wrong = next((n for n, a in others.items() if a.size != stamps.size), None)
    if wrong is not None or not others:
        raise contradiction(content, f"{wrong or 'no array'} does not have one value for each time")
    time: UniformTime | StampedTime
    if timebase.uniform is not None:
        time = timebase.uniform
    else:
        kept: Samples = ArraySamples(frozen(np.delete(stamps, timebase.dropped)))
        if any(timebase.shifts_s):
            starts = tuple(span.start for span in timebase.spans)
            kept = ShiftedStamps(stamps=kept, starts=starts, shifts_s=timebase.shifts_s)
        time = StampedTime(stamps=kept, resolution_s=timebase.resolution_s)
    return tuple(
        _channel(name, np.delete(a, timebase.dropped), time, timebase.spans)
        for name, a in others.items()
    )


def _channel(
    name: str, values: NDArray[Any], time: UniformTime | StampedTime, spans: tuple[Span, ...]
) -> Waveform:
    """Return one channel: booleans are logic, integers codes, floats volts."""
    if values.dtype.kind == "b":
        samples, scale, unit = values.astype(np.uint8), Scale(), "1"
    elif values.dtype.kind in "iu":
        samples, scale, unit = values, Scale(step_v=code_step(values)), "V"
    else:
        samples, scale, unit = values, Scale(), "V"
    return Waveform(
        samples=ArraySamples(frozen(samples)),
        scale=scale,
        time=time,
        spans=spans,
        channel="".join(c for c in name if c.isprintable()),
        unit=unit,
    )
