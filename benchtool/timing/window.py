"""A part of a capture, as if nothing else had been recorded."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import replace

import numpy as np

from benchtool.errors import MeasurementError
from benchtool.frozen import frozen_record
from benchtool.model.arrays import AnyArray
from benchtool.model.capture import (
    Capture,
    LogicTrace,
    Samples,
    Span,
    StampedTime,
    StructurePoint,
    TimeSpan,
    Trace,
    UniformTime,
    Waveform,
)
from benchtool.model.quantity import Notice
from benchtool.model.window import Window
from benchtool.units import format_value

_ON_GRID = 1e-6
"""Share of a sample interval by which a limit may miss a sample that it names: rounding."""


@frozen_record(eq=False)
class PartSamples:
    """Samples ``first`` to ``last`` of others, numbered from 0; nothing else of them is read."""

    whole: Samples
    first: int
    last: int

    @property
    def size(self) -> int:
        """Number of samples."""
        return self.last - self.first

    @property
    def dtype(self) -> np.dtype[np.generic]:
        """Type of a sample."""
        return self.whole.dtype

    def blocks(self, start: int = 0, stop: int | None = None) -> Iterator[AnyArray]:
        """Yield consecutive pieces of the samples ``start`` to ``stop``."""
        end = self.size if stop is None else min(stop, self.size)
        if start < end:
            yield from self.whole.blocks(self.first + start, self.first + end)


def narrow(capture: Capture, window: Window) -> Capture:
    """Return the part of a capture that lies in a window; its times stay those of the record.

    Samples and transitions outside are not there for what follows, so that an interval which
    the window cuts is one that the record's end cuts.

    Args:
        capture: The capture.
        window: The part, both ends included.

    Returns:
        The part, with the window among its structure and its warnings. A trace that has nothing
        there is left out, and said.

    Raises:
        MeasurementError: If no trace has anything in the window (``window-outside``).
    """
    spans_s = [_span_of(trace) for trace in capture.traces]
    record = Window(from_s=min(a for a, _ in spans_s), to_s=_after(max(b for _, b in spans_s)))
    parts = [_part(trace, window) for trace in capture.traces]
    kept = tuple(part for part in parts if part is not None)
    if not kept:
        raise _outside(capture.origin.source, window, record)
    inside = Window(
        from_s=max(window.from_s, record.from_s), to_s=_after(min(window.to_s, record.to_s))
    )
    words = (
        f"{_shown(inside)} of the record, which goes from {_seconds(record.from_s)} "
        f"to {_seconds(record.to_s)}"
    )
    pairs = zip(capture.traces, parts, strict=True)
    lost = [trace.channel for trace, part in pairs if part is None]
    return replace(
        capture,
        traces=kept,
        window=inside,
        structure=(*capture.structure, _point(inside, record)),
        warnings=(
            *capture.warnings,
            Notice(code="window", text=f"only a part was measured: {words}"),
            *_missing(lost),
        ),
    )


def _after(time_s: float) -> float:
    """Return a time that may end a window: above zero also for a record of no length."""
    return max(time_s, np.finfo(np.float64).tiny)


def _shown(window: Window) -> str:
    return f"{_seconds(window.from_s)} to {_seconds(window.to_s)}"


def _seconds(time_s: float) -> str:
    return format_value(time_s, "s", 6)


def _point(inside: Window, record: Window) -> StructurePoint:
    return StructurePoint(
        name="window",
        value=_shown(inside),
        evidence=f"--from, --to; the record is {_shown(record)}",
        sure="stated",
    )


def _missing(channels: list[str]) -> tuple[Notice, ...]:
    if not channels:
        return ()
    text = f"nothing of {', '.join(channels[:8])} lies in the window: left out"
    return (Notice(code="traces-outside-window", text=text),)


def _outside(source: str, window: Window, record: Window) -> MeasurementError:
    end = "its end" if window.to_s == float("inf") else _seconds(window.to_s)
    return MeasurementError(
        f"nothing of {source} lies from {_seconds(window.from_s)} to {end}",
        hint=f"The record goes from {_shown(record)} after its first sample: "
        "give --from and --to inside of it, with at least two samples between them.",
        code="window-outside",
    )


def _span_of(trace: Trace) -> tuple[float, float]:
    """Return the times of the first and the last sample, or of the record's ends."""
    if isinstance(trace, LogicTrace):
        if not trace.spans:
            return 0.0, 0.0
        return trace.spans[0].start_s, trace.spans[-1].end_s
    last = trace.spans[-1]
    return trace.spans[0].start_s, _time_of(trace, last, last.stop - 1)


def _time_of(trace: Waveform, span: Span, index: int) -> float:
    if isinstance(trace.time, UniformTime):
        return span.start_s + (index - span.start) * trace.time.dt_s
    return float(next(trace.time.stamps.blocks(index, index + 1))[0])


def _part(trace: Trace, window: Window) -> Trace | None:
    """Return the part of a trace in a window; None where there is nothing to measure."""
    if isinstance(trace, LogicTrace):
        return _logic_part(trace, window)
    return _waveform_part(trace, window)


def _waveform_part(trace: Waveform, window: Window) -> Waveform | None:
    spans = [part for span in trace.spans if (part := _cut(trace, span, window)) is not None]
    if sum(span.stop - span.start for span in spans) < 2:
        return None
    first, last = spans[0].start, spans[-1].stop
    time = trace.time
    if isinstance(time, StampedTime):
        stamps = PartSamples(whole=time.stamps, first=first, last=last)
        time = replace(time, stamps=stamps)
    return replace(
        trace,
        samples=PartSamples(whole=trace.samples, first=first, last=last),
        time=time,
        spans=tuple(
            replace(span, start=span.start - first, stop=span.stop - first) for span in spans
        ),
    )


def _cut(trace: Waveform, span: Span, window: Window) -> Span | None:
    """Return the samples of a span that lie in the window."""
    start = _first_at(trace, span, window.from_s)
    stop = span.stop if window.to_s == float("inf") else _first_after(trace, span, window.to_s)
    if start >= stop:
        return None
    return Span(start=start, stop=stop, start_s=_time_of(trace, span, start))


def _first_at(trace: Waveform, span: Span, time_s: float) -> int:
    """Return the first sample of a span at ``time_s`` or later."""
    if isinstance(trace.time, UniformTime):
        steps = np.ceil((time_s - span.start_s) / trace.time.dt_s - _ON_GRID)
        return span.start + int(np.clip(steps, 0, span.stop - span.start))
    return _bisected(trace, span, lambda stamp: stamp < time_s)


def _first_after(trace: Waveform, span: Span, time_s: float) -> int:
    """Return the first sample of a span later than ``time_s``."""
    if isinstance(trace.time, UniformTime):
        steps = np.floor((time_s - span.start_s) / trace.time.dt_s + _ON_GRID) + 1
        return span.start + int(np.clip(steps, 0, span.stop - span.start))
    return _bisected(trace, span, lambda stamp: stamp <= time_s)


def _bisected(trace: Waveform, span: Span, before: Callable[[float], bool]) -> int:
    """Return the first sample whose stamp is not ``before``; few blocks of stamps are read."""
    low, high = span.start, span.stop
    while low < high:
        middle = (low + high) // 2
        if before(_time_of(trace, span, middle)):
            low = middle + 1
        else:
            high = middle
    return low


def _logic_part(trace: LogicTrace, window: Window) -> LogicTrace | None:
    spans = tuple(
        TimeSpan(
            start_s=max(span.start_s, window.from_s),
            end_s=min(span.end_s, window.to_s),
            starts_high=_state_at(trace, span, window.from_s),
        )
        for span in trace.spans
        if span.start_s < window.to_s and span.end_s > window.from_s
    )
    if not spans:
        return None
    inside = (trace.times_s > window.from_s) & (trace.times_s <= window.to_s)
    if trace.spans[0].start_s >= window.from_s:
        inside |= trace.times_s == trace.spans[0].start_s
    return replace(
        trace,
        times_s=trace.times_s[inside],
        states=trace.states[inside],
        spans=spans,
        end_known=trace.end_known or window.to_s < trace.spans[-1].end_s,
    )


def _state_at(trace: LogicTrace, span: TimeSpan, time_s: float) -> bool:
    """Return the state of a span where the window begins to see it."""
    last = int(np.searchsorted(trace.times_s, time_s, side="right")) - 1
    if time_s <= span.start_s or last < 0 or trace.times_s[last] < span.start_s:
        return span.starts_high
    return bool(trace.states[last])
