"""A capture put at its place in a longer record."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from benchtool.model.capture import (
    ArraySamples,
    Capture,
    LogicTrace,
    StampedTime,
    Trace,
    UniformTime,
    Waveform,
)
from benchtool.model.window import Window


def end_of(capture: Capture) -> float:
    """Return the time of the last row, in seconds after the first."""
    return max(_end(trace) for trace in capture.traces)


def _end(trace: Trace) -> float:
    if isinstance(trace, LogicTrace):
        return trace.spans[-1].end_s
    last = trace.spans[-1]
    if isinstance(trace.time, UniformTime):
        return last.start_s + (last.stop - 1 - last.start) * trace.time.dt_s
    return float(next(iter(trace.time.stamps.blocks(last.stop - 1, last.stop)))[0])


def placed(capture: Capture, offset_s: float) -> Capture:
    """Return a capture whose times count from the beginning of the record it is a part of.

    Args:
        capture: The part.
        offset_s: Where its first row lies in the record.
    """
    if offset_s <= 0:
        return capture
    return replace(
        capture,
        traces=tuple(_placed(trace, offset_s) for trace in capture.traces),
        window=Window(from_s=offset_s, to_s=offset_s + max(end_of(capture), 1e-12)),
    )


def _placed(trace: Trace, offset_s: float) -> Trace:
    if isinstance(trace, LogicTrace):
        moved = (
            replace(span, start_s=span.start_s + offset_s, end_s=span.end_s + offset_s)
            for span in trace.spans
        )
        return replace(trace, times_s=trace.times_s + offset_s, spans=tuple(moved))
    return _placed_waveform(trace, offset_s)


def _placed_waveform(trace: Waveform, offset_s: float) -> Waveform:
    spans = tuple(replace(span, start_s=span.start_s + offset_s) for span in trace.spans)
    time = trace.time
    if isinstance(time, StampedTime):
        stamps = np.concatenate([block.astype(np.float64) for block in time.stamps.blocks()])
        time = replace(time, stamps=ArraySamples(stamps + offset_s))
    return replace(trace, spans=spans, time=time)
