"""The slopes of a node: its samples, cut where it turns."""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np

from benchtool.errors import MeasurementError
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, middle
from benchtool.model.capture import BLOCK, Waveform
from benchtool.model.timing import Edges
from benchtool.timing.pieces import Piece, cut_pieces, piece_times, walk_pieces

MOST_POINTS = 1 << 18
"""Points that are held; longer records are averaged down to them."""

_LEAST_A_SLOPE = 48  # points that averaging leaves a slope
_LEAST_POINTS = 8  # of a slope that is fitted


@frozen_record(eq=False)
class Points:
    """Samples of a node, or means of neighbours, in order of time.

    Attributes:
        times_s: Shape (n,).
        volts: Shape (n,).
        step_s: Usual distance of two.
        n_averaged: Samples in each.
        is_part: Whether the record goes on after the last.
    """

    times_s: FloatArray
    volts: FloatArray
    step_s: float
    n_averaged: int
    is_part: bool


@frozen_record
class Slope:
    """One slope: points ``first`` to ``stop`` (exclusive).

    Attributes:
        rises: Whether the capacitor charges.
        begin_s, end_s: From turn to turn, or to an end of the run where it is cut.
        first, stop: Its points.
        begins, ends: Whether a turn is there.
    """

    rises: bool
    begin_s: float
    end_s: float
    first: int
    stop: int
    begins: bool
    ends: bool

    @property
    def is_whole(self) -> bool:
        """Whether it goes from turn to turn."""
        return self.begins and self.ends


def take_points(trace: Waveform, usual_s: float) -> Points:
    """Return the samples of a trace in volts, averaged where there are too many to hold.

    Args:
        trace: The node.
        usual_s: Usual length of a slope, seconds: enough points are left of it.
    """
    n = sum(span.stop - span.start for span in trace.spans)
    a_sample_s = _sample_s(trace)
    room = max(1, int(usual_s / a_sample_s / _LEAST_A_SLOPE)) if a_sample_s > 0 else 1
    n_averaged = min(room, max(1, math.ceil(n / MOST_POINTS)))
    times: list[FloatArray] = []
    volts: list[FloatArray] = []
    held = 0
    for piece in cut_pieces(walk_pieces(trace), BLOCK):
        if held >= MOST_POINTS:
            break
        times.append(_averaged(piece_times(trace, piece), n_averaged))
        volts.append(_averaged(_volts(trace, piece), n_averaged))
        held += times[-1].size
    all_s = np.concatenate(times) if times else np.empty(0)
    if all_s.size < _LEAST_POINTS:
        raise too_short(f"the node has {all_s.size} samples")
    return Points(
        times_s=all_s,
        volts=np.concatenate(volts),
        step_s=middle(np.diff(all_s)),
        n_averaged=n_averaged,
        is_part=held * n_averaged < n - n_averaged * (len(times) + 1),
    )


def _sample_s(trace: Waveform) -> float:
    for piece in walk_pieces(trace):
        times_s = piece_times(trace, piece)
        if times_s.size > 1:
            return float(times_s[-1] - times_s[0]) / (times_s.size - 1)
    return 0.0


def _volts(trace: Waveform, piece: Piece) -> FloatArray:
    volts: FloatArray = piece.values.astype(np.float64) * trace.scale.gain + trace.scale.offset
    return volts


def _averaged(values: FloatArray, n: int) -> FloatArray:
    whole = values.size // n * n
    means: FloatArray = values[:whole].reshape(-1, n).mean(axis=1) if n > 1 else values
    return means


def cut_slopes(points: Points, edges: Edges) -> tuple[Slope, ...]:
    """Return the slopes between the turning points, those cut by an end of a run too.

    Args:
        points: The samples.
        edges: The turning points.
    """
    found: list[Slope] = []
    last_s = float(points.times_s[-1])
    for run in edges.runs:
        turns_s = [float(t) for t in edges.times_s[run.first : run.stop]]
        limits = [run.start_s, *turns_s, run.end_s]
        rises = run.starts_high
        for number, (begin_s, end_s) in enumerate(pairwise(limits)):
            begins, ends = number > 0, number < len(turns_s)
            if end_s > last_s + points.step_s:
                break
            first, stop = (int(x) for x in np.searchsorted(points.times_s, (begin_s, end_s)))
            if stop - first >= _LEAST_POINTS:
                found.append(
                    Slope(
                        rises=rises,
                        begin_s=begin_s,
                        end_s=end_s,
                        first=first,
                        stop=stop,
                        begins=begins,
                        ends=ends,
                    )
                )
            rises = not rises
    return tuple(found)


def too_short(what: str) -> MeasurementError:
    """Return the error of a record that shows too little of a slope."""
    return MeasurementError(
        f"{what}, which does not fix an exponential",
        hint="Record at least one whole rise or fall of the capacitor with 50 samples on it.",
        code="node-too-short",
    )
