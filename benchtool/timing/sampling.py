"""A part of a long record that stands for all of it: contiguous runs spread over its length."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from benchtool.model.arrays import FloatArray
from benchtool.model.capture import Samples, Waveform
from benchtool.timing.rows import Codes

N_RUNS = 64
RUN = 1 << 12
"""Samples in a run: together a quarter million, from which a mean is good to a code's 1/500."""

_READ_ON = 1 << 16  # samples between two runs that are read over rather than sought anew
_GOLDEN = 0.6180339887498949


def sample_runs(waveform: Waveform) -> tuple[FloatArray, ...]:
    """Return contiguous runs of a record, in volts; missing samples are left out.

    Args:
        waveform: The trace, longer than all runs together.
    """
    wanted = _places(waveform)
    found: list[FloatArray] = []
    for start, stop in _extents(wanted):
        inside = [place for place in wanted if start <= place[0] < stop]
        found += _cut(waveform.samples, (start, stop), inside)
    gain, offset = waveform.scale.gain, waveform.scale.offset
    runs = (_present(run) * gain + offset for run in found)
    return tuple(run for run in runs if run.size)


def _present(values: FloatArray) -> FloatArray:
    """Return the samples that are there."""
    there = np.isfinite(values)
    return values if there.all() else values[there]


def _places(waveform: Waveform) -> list[tuple[int, int]]:
    """Return where the runs begin and end; a run that meets the end of a span is cut there.

    One lies in each of as many equal parts of the record, at a place that varies so that they
    cannot beat with the signal.
    """
    length = np.array([span.stop - span.start for span in waveform.spans])
    until = np.cumsum(length)
    part = int(until[-1]) / N_RUNS
    places: list[tuple[int, int]] = []
    for k in range(N_RUNS):
        at = int(k * part + (k * _GOLDEN % 1.0) * (part - RUN))
        end = at + RUN
        while at < end:
            i = int(np.searchsorted(until, at, side="right"))
            shift = waveform.spans[i].start - int(until[i] - length[i])
            stop = min(end, int(until[i]))
            places.append((at + shift, stop + shift))
            at = stop
    return places


def _extents(places: list[tuple[int, int]]) -> list[tuple[int, int]]:
    """Join places that lie close, since reading on costs less than opening a file again."""
    joined: list[tuple[int, int]] = []
    for start, stop in places:
        if joined and start - joined[-1][1] <= _READ_ON:
            joined[-1] = (joined[-1][0], stop)
        else:
            joined.append((start, stop))
    return joined


def _cut(
    samples: Samples, extent: tuple[int, int], places: list[tuple[int, int]]
) -> Iterator[FloatArray]:
    """Yield the samples at the places, all of which lie in the extent."""
    parts: list[list[Codes]] = [[] for _ in places]
    first = extent[0]
    for block in samples.blocks(*extent):
        for (start, stop), part in zip(places, parts, strict=True):
            if start < first + block.size and stop > first:
                part.append(block[max(0, start - first) : stop - first])
        first += block.size
    for part in parts:
        if part:
            yield np.concatenate(part).astype(np.float64)
