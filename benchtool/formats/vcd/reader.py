"""From a value change dump to a capture."""

from __future__ import annotations

import math

import numpy as np

from benchtool.errors import AmbiguousStructureError, MalformedCaptureError
from benchtool.formats.content import Content
from benchtool.formats.grid import greatest_common_spacing
from benchtool.formats.logic import States, logic_trace
from benchtool.formats.vcd.body import Body, Changes, RealChanges, read_body
from benchtool.formats.vcd.header import (
    PER_SECOND,
    REALS,
    Header,
    Variable,
    read_header,
    trace_names,
)
from benchtool.model.arrays import FloatArray, distinct
from benchtool.model.capture import (
    ArraySamples,
    Capture,
    LogicTrace,
    Origin,
    ReadOptions,
    Span,
    StampedTime,
    StructurePoint,
    Trace,
    Waveform,
)
from benchtool.model.quantity import Notice

_WIDEST = 64
_HEADER_BYTES = 1 << 22


def read_vcd(content: Content, options: ReadOptions) -> Capture:
    """Read a value change dump: a logic trace for each scalar and each bit of small vectors.

    Raises:
        AmbiguousStructureError: If it states no timescale and none is given.
        MalformedCaptureError: If it is damaged or holds no signal.
    """
    header = read_header(content.head(_HEADER_BYTES), content.source)
    per_second, scale_point, warnings = _timescale(header, options, content.source)
    names = trace_names(header.variables)
    wanted, skipped = _wanted(header.variables)
    body = Body(
        bits={v.code: [Changes() for _ in range(v.width)] for v in wanted if v.kind not in REALS},
        reals={v.code: RealChanges() for v in wanted if v.kind in REALS},
    )
    read_body(content, header.body, body, {v.code for v in header.variables})
    traces = _traces(wanted, names, body, per_second)
    if not traces or body.start is None:
        raise MalformedCaptureError(
            f"{content.source} declares {len(header.variables)} signals and holds no change of any",
            hint="Dump the signal while it runs, and save again.",
            path=content.source,
            code="no-values",
        )
    return Capture(
        origin=Origin(
            source=content.source,
            format="vcd",
            sha256=content.sha256,
            instrument=header.version or None,
        ),
        traces=traces,
        structure=(scale_point, *_points(header, traces, names, body, per_second)),
        warnings=(*warnings, *_notices(skipped, body)),
    )


def _timescale(
    header: Header, options: ReadOptions, source: str
) -> tuple[float, StructurePoint, tuple[Notice, ...]]:
    """Return the counts a second."""
    if header.timescale is not None:
        multiple, unit = header.timescale
        evidence = "$timescale"
    elif options.time_unit in PER_SECOND:
        multiple, unit = 1, str(options.time_unit)
        evidence = "--time-unit"
    else:
        raise AmbiguousStructureError(
            f"{source} has no $timescale, so its times have no unit",
            hint="Name the unit of one count with --time-unit s, ms, us, ns, ps or fs.",
            code="no-timescale",
        )
    per_second = PER_SECOND[unit] / multiple
    point = StructurePoint(name="time_unit", value=f"{multiple} {unit}", evidence=evidence)
    return per_second, point, ()


def _wanted(variables: list[Variable]) -> tuple[list[Variable], list[Variable]]:
    """Return one variable for each code, and those left out: events and wide vectors."""
    wanted: dict[bytes, Variable] = {}
    skipped = []
    for variable in variables:
        if variable.kind == "event" or (variable.kind not in REALS and variable.width > _WIDEST):
            skipped.append(variable)
        else:
            wanted.setdefault(variable.code, variable)
    return list(wanted.values()), skipped


def _traces(
    wanted: list[Variable], names: dict[Variable, str], body: Body, per_second: float
) -> tuple[Trace, ...]:
    traces: list[Trace] = []
    start = body.start or 0
    for variable in wanted:
        name = names[variable]
        if variable.kind in REALS:
            traces += _real_trace(body.reals[variable.code], name, body, per_second)
            continue
        titles = [f"{name}[{i}]" for i in variable.bits] or [name]
        for title, changes in zip(titles, body.bits[variable.code], strict=True):
            if len(changes.times) and any(state >= 0 for state in changes.states):
                times = np.frombuffer(changes.times, np.int64) - start
                states = np.frombuffer(changes.states, np.int8)
                traces.append(_logic(times, states, title, body.end - start, per_second))
    return tuple(traces)


def _logic(
    times: np.ndarray[tuple[int], np.dtype[np.int64]],
    states: States,
    title: str,
    end: int,
    per_second: float,
) -> LogicTrace:
    """Make a trace; its tick is what all its transitions share, not the timescale."""
    changed = np.concatenate([[False], states[1:] != states[:-1]]) & (states >= 0)
    tick = greatest_common_spacing(times[changed])
    return logic_trace(
        times / per_second,
        states,
        end_s=end / per_second,
        tick_s=tick / per_second,
        channel=title,
        end_stated=False,
    )


def _real_trace(changes: RealChanges, name: str, body: Body, per_second: float) -> list[Trace]:
    """Return a real as logic where it has two values, else as a staircase of stamped samples."""
    times = np.frombuffer(changes.times, np.int64) - (body.start or 0)
    values = np.frombuffer(changes.values, np.float64)
    if values.size < 2:
        return []
    levels = distinct(values)
    if levels.size == 2:
        states = (values == levels[1]).astype(np.int8)
        return [_logic(times, states, name, body.end - (body.start or 0), per_second)]
    stamps, held = _staircase(times, values)
    return [
        Waveform(
            samples=ArraySamples(held),
            time=StampedTime(stamps=ArraySamples(stamps / per_second), resolution_s=1 / per_second),
            spans=(Span(start=0, stop=held.size, start_s=0.0),),
            channel=name,
        )
    ]


def _staircase(
    times: np.ndarray[tuple[int], np.dtype[np.int64]], values: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Let each value hold until one count before the next."""
    last = np.append(np.diff(times) > 0, True)
    times, values = times[last], values[last]
    holds = np.flatnonzero(np.diff(times) > 1)
    stamps = np.insert(times, holds + 1, times[holds + 1] - 1)
    return stamps.astype(np.float64), np.insert(values, holds + 1, values[holds])


def _points(
    header: Header,
    traces: tuple[Trace, ...],
    names: dict[Variable, str],
    body: Body,
    per_second: float,
) -> list[StructurePoint]:
    start = body.start or 0
    points = [
        ("channels", ", ".join(trace.channel for trace in traces[:64]), "$var"),
        ("start", f"{start / per_second:.9g} s", f"first time #{start}"),
        ("end", f"{body.end / per_second:.9g} s", f"last time #{body.end}"),
    ]
    first: dict[bytes, str] = {}
    for variable in header.variables:
        known = first.setdefault(variable.code, names[variable])
        if known != names[variable]:
            points.append(("alias", names[variable], f"same identifier code as {known}"))
    ticks = [t.tick_s for t in traces if isinstance(t, LogicTrace) and t.tick_s > 0]
    if ticks:
        evidence = "greatest common spacing of its transitions"
        points.append(("tick", f"{math.fsum(ticks[:1]):.9g} s ({traces[0].channel})", evidence))
    return [StructurePoint(name=n, value=v, evidence=e) for n, v, e in points]


def _notices(skipped: list[Variable], body: Body) -> list[Notice]:
    notices = []
    if skipped:
        notices.append(
            Notice(
                code="signals-skipped",
                text=f"{len(skipped)} variables were left out (events, and vectors of more than "
                f"{_WIDEST} bits), the first {skipped[0].name}",
            )
        )
    if body.cut:
        notices.append(
            Notice(
                code="file-cut",
                text=f"the dump ends inside a value change ({body.cut[:30]!r}); "
                "it was read to the change before",
            )
        )
    return notices
