"""Enough of a trace to draw it without its samples."""

from __future__ import annotations

import math

import numpy as np

from benchtool.model.arrays import AnyArray, FloatArray, NDArray, distinct, middle
from benchtool.model.capture import LogicTrace, Span, Trace, UniformTime, Waveform
from benchtool.model.overview import Overview
from benchtool.model.timing import Edges, Intervals

MOST_POINTS = 2000
MOST_PERIODS = 500
_CYCLES = 4.3
_MOST_BINS = 40


def make_overview(trace: Trace, edges: Edges, intervals: Intervals) -> Overview:
    """Return envelope, edges, histogram and periods in few enough points to draw.

    Args:
        trace: The trace; of a waveform only the first cycles are walked, in blocks.
        edges: Its edges.
        intervals: Its intervals.
    """
    until_s = _first_cycles(edges, intervals)
    if isinstance(trace, LogicTrace):
        at_s, low, high = _logic_envelope(edges, until_s)
    else:
        at_s, low, high = _envelope(trace, until_s)
    inside = edges.times_s <= (at_s[-1] if at_s.size else until_s)
    count, limits = _histogram(intervals.period_s, edges.step_s)
    chosen = _thinned(intervals.period_s.size)
    return Overview(
        envelope_s=at_s,
        envelope_low_v=low,
        envelope_high_v=high,
        edges_s=edges.times_s[inside][:MOST_POINTS],
        histogram_s=limits,
        histogram_count=count,
        periods_at_s=intervals.period_starts_s[chosen],
        periods_s=intervals.period_s[chosen],
    )


def _first_cycles(edges: Edges, intervals: Intervals) -> float:
    """Return the end of the first few cycles, or of the record where there are none."""
    if intervals.period_s.size:
        return float(intervals.period_starts_s[0] + _CYCLES * middle(intervals.period_s))
    return edges.runs[-1].end_s if edges.runs else 0.0


def _envelope(trace: Waveform, until_s: float) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return bin times with the least and greatest volt of each bin."""
    left = _samples_until(trace, until_s)
    bin_size = max(1, -(-left // MOST_POINTS))
    parts: list[tuple[FloatArray, FloatArray, FloatArray]] = []
    for span in trace.spans:
        stop = min(span.stop, span.start + left)
        low, high = _extremes(trace, span.start, stop, bin_size)
        parts.append((_bin_times(trace, span, stop, bin_size), low, high))
        left -= stop - span.start
        if left <= 0:
            break
    at_s, lows, highs = (np.concatenate(part) for part in zip(*parts, strict=True))
    known = np.isfinite(lows)
    return (
        at_s[known][:MOST_POINTS],
        np.minimum(lows, highs)[known][:MOST_POINTS],
        np.maximum(lows, highs)[known][:MOST_POINTS],
    )


def _extremes(
    trace: Waveform, start: int, stop: int, bin_size: int
) -> tuple[FloatArray, FloatArray]:
    """Return the volts of the least and the greatest sample of each bin, found in codes."""
    number: list[NDArray[np.int64]] = []
    least: list[AnyArray] = []
    greatest: list[AnyArray] = []
    done = 0
    for block in trace.samples.blocks(start, stop):
        values = np.asarray(block)
        begins = np.maximum(np.arange(-(done % bin_size), values.size, bin_size), 0)
        number.append((done + begins) // bin_size)
        least.append(np.fmin.reduceat(values, begins))
        greatest.append(np.fmax.reduceat(values, begins))
        done += values.size
    bins = np.flatnonzero(np.diff(np.concatenate(number), prepend=-1))  # two blocks may share one
    low = np.fmin.reduceat(np.concatenate(least), bins).astype(np.float64)
    high = np.fmax.reduceat(np.concatenate(greatest), bins).astype(np.float64)
    gain, offset = trace.scale.gain, trace.scale.offset
    return low * gain + offset, high * gain + offset


def _samples_until(trace: Waveform, until_s: float) -> int:
    total = sum(span.stop - span.start for span in trace.spans)
    if isinstance(trace.time, UniformTime):
        wanted = sum(
            min(span.stop - span.start, int((until_s - span.start_s) / trace.time.dt_s) + 1)
            for span in trace.spans
            if span.start_s <= until_s
        )
        return max(1, min(total, wanted))
    seen = 0
    for block in trace.time.stamps.blocks():
        before = int(np.count_nonzero(block.astype(np.float64) <= until_s))
        seen += before
        if before < block.size:
            break
    return max(1, min(total, seen))


def _bin_times(trace: Waveform, span: Span, stop: int, bin_size: int) -> FloatArray:
    """Return the time of the first sample of each bin."""
    index = np.arange(0, stop - span.start, bin_size).astype(np.float64)
    if isinstance(trace.time, UniformTime):
        return span.start_s + index * trace.time.dt_s
    found: list[FloatArray] = []
    done = 0
    for block in trace.time.stamps.blocks(span.start, stop):
        found.append(block[-done % bin_size :: bin_size].astype(np.float64))
        done += block.size
    return np.concatenate(found)


def _logic_envelope(edges: Edges, until_s: float) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return the corners of a 0/1 drawing."""
    times, states = edges.times_s, edges.rising
    chosen = np.flatnonzero(times <= until_s)[: MOST_POINTS // 2 - 2]
    start_s = edges.runs[0].start_s if edges.runs else 0.0
    starts_high = bool(edges.runs and edges.runs[0].starts_high)
    after = states[chosen].astype(np.float64)
    before = np.concatenate([[float(starts_high)], after[:-1]]) if chosen.size else np.empty(0)
    at_s = np.concatenate([[start_s], np.repeat(times[chosen], 2), [max(until_s, start_s)]])
    corners = np.stack([before, after], axis=1).ravel()
    last = corners[-1] if corners.size else float(starts_high)
    values = np.concatenate([[float(starts_high)], corners, [last]])
    return at_s, values, values


def _histogram(period_s: FloatArray, step_s: float) -> tuple[FloatArray, FloatArray]:
    """Return counts and bin limits; bins are no narrower than the grid."""
    if period_s.size < 2:
        return np.empty(0), np.empty(0)
    span_s = float(np.ptp(period_s))
    if span_s <= 1e-12 * float(period_s[0]):
        return np.empty(0), np.empty(0)
    bins = max(4, min(_MOST_BINS, round(math.sqrt(period_s.size))))
    if step_s > 0:
        bins = max(1, min(bins, round(span_s / step_s) + 1))
    count, limits = np.histogram(period_s, bins=bins)
    return count.astype(np.float64), limits


def _thinned(n: int) -> NDArray[np.int64]:
    return distinct(np.linspace(0, n - 1, min(n, MOST_PERIODS)).round().astype(np.int64))
