"""The user's own sample interval, in place of what the file says."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import replace

from benchtool.formats.overrules import idle_option
from benchtool.model.capture import (
    Capture,
    LogicTrace,
    Span,
    StructurePoint,
    Trace,
    UniformTime,
    Waveform,
)
from benchtool.model.quantity import Notice

_MOOT = {"interval-differs", "assumed-time-unit"}
"""What was said of a scale that no longer counts."""


def retimed(capture: Capture, interval_s: float) -> Capture:
    """Return a capture whose samples are ``interval_s`` apart, its holes where they were.

    Samples on an even grid keep their holes, scaled; of uneven stamps the rows are counted.

    Args:
        capture: As the format read it.
        interval_s: Sample interval in seconds.

    Raises:
        UsageError: If it holds transitions, which are no samples (``option-idle``).
    """
    if all(_interval_of(trace) == interval_s for trace in capture.traces):
        return capture
    traces = tuple(_retimed(trace, interval_s, capture.origin.source) for trace in capture.traces)
    notice = Notice(
        code="interval-overruled",
        text=f"the sample interval given, {interval_s:.6g} s, was taken in place of the file's "
        f"own: {_own(capture.traces)}",
    )
    warnings = (w for w in capture.warnings if w.code not in _MOOT)
    return replace(
        capture,
        traces=traces,
        structure=tuple(_points(capture.structure, interval_s)),
        warnings=(*_moved(warnings, traces), notice),
    )


def _interval_of(trace: Trace) -> float | None:
    if isinstance(trace, Waveform) and isinstance(trace.time, UniformTime):
        return trace.time.dt_s
    return None


def _own(traces: Iterable[Trace]) -> str:
    own_s = next((dt for dt in map(_interval_of, traces) if dt is not None), None)
    return "uneven time stamps" if own_s is None else f"{own_s:.6g} s"


def _retimed(trace: Trace, interval_s: float, source: str) -> Trace:
    if isinstance(trace, LogicTrace):
        raise idle_option(
            "interval_s",
            source,
            f"{trace.channel} is a list of transitions, each with its own time",
            "Leave it out; --time-unit sets the unit of those times.",
        )
    return replace(
        trace,
        time=UniformTime(dt_s=interval_s),
        spans=tuple(_placed(span, trace, interval_s) for span in trace.spans),
    )


def _placed(span: Span, trace: Waveform, interval_s: float) -> Span:
    own_s = _interval_of(trace)
    start_s = span.start * interval_s if own_s is None else span.start_s / own_s * interval_s
    return replace(span, start_s=start_s)


def _points(points: Iterable[StructurePoint], interval_s: float) -> Iterator[StructurePoint]:
    """Give the interval taken, and leave out a unit of time that was only assumed."""
    for point in points:
        if point.name == "time_unit" and point.sure == "assumed":
            continue
        shown = point.name == "interval"
        yield replace(point, value=f"{interval_s:.9g} s") if shown else point


def _moved(warnings: Iterable[Notice], traces: tuple[Trace, ...]) -> Iterator[Notice]:
    """Let a notice of holes give the first one's place in the new times."""
    spans = traces[0].spans
    for warning in warnings:
        if warning.code == "gaps" and len(spans) > 1:
            text = (
                f"the record has {len(spans) - 1} hole(s), the first before "
                f"{spans[1].start_s:.6g} s; no interval is measured across one"
            )
            yield replace(warning, text=text)
        else:
            yield warning
