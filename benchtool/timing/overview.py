"""Enough of a trace to draw it without its samples."""

from __future__ import annotations

import math

import numpy as np

from benchtool.model.arrays import FloatArray, NDArray, distinct, middle
from benchtool.model.capture import BLOCK, LogicTrace, Trace, UniformTime, Waveform
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
    n_wanted = _samples_until(trace, until_s)
    bin_size = max(1, -(-n_wanted // MOST_POINTS))
    times: list[FloatArray] = []
    low: list[FloatArray] = []
    high: list[FloatArray] = []
    left = n_wanted
    for span in trace.spans:
        stop = min(span.stop, span.start + left)
        for first in range(span.start, stop, max(1, BLOCK // bin_size) * bin_size):
            last = min(stop, first + max(1, BLOCK // bin_size) * bin_size)
            values = _volts(trace, first, last)
            starts = np.arange(0, values.size, bin_size)
            low.append(np.fmin.reduceat(values, starts))
            high.append(np.fmax.reduceat(values, starts))
            times.append(_times(trace, span.start_s, span.start, first, last)[starts])
        left -= stop - span.start
        if left <= 0:
            break
    at_s, lows, highs = (np.concatenate(part) for part in (times, low, high))
    known = np.isfinite(lows)
    return (
        at_s[known][:MOST_POINTS],
        np.minimum(lows, highs)[known][:MOST_POINTS],
        np.maximum(lows, highs)[known][:MOST_POINTS],
    )


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


def _volts(trace: Waveform, first: int, last: int) -> FloatArray:
    parts = [block.astype(np.float64) for block in trace.samples.blocks(first, last)]
    volts: FloatArray = np.concatenate(parts) * trace.scale.gain + trace.scale.offset
    return volts


def _times(trace: Waveform, start_s: float, start: int, first: int, last: int) -> FloatArray:
    if isinstance(trace.time, UniformTime):
        index = np.arange(first - start, last - start, dtype=np.float64)
        return start_s + index * trace.time.dt_s
    parts = [block.astype(np.float64) for block in trace.time.stamps.blocks(first, last)]
    stamps: FloatArray = np.concatenate(parts)
    return stamps


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
