"""Crossings of the mid level, found block by block in the samples' own codes."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, FloatArray, NDArray
from benchtool.model.capture import Span, UniformTime, Waveform
from benchtool.timing.changes import find_changes
from benchtool.timing.lengths import TransitionLengths
from benchtool.timing.pieces import Index, Piece, times_at, walk_pieces
from benchtool.timing.rows import Codes
from benchtool.timing.tally import Tally
from benchtool.timing.thresholds import Thresholds

_Choice = Index | slice


@frozen_record(eq=False)
class Crossings:
    """Completed transitions of one gap-free run.

    Attributes:
        index: Sample index of the first sample past the mid level, of the crossing in the middle
            of each transition, shape (n,).
        rising: Direction in volts, shape (n,).
        before, after: Samples on both sides of that crossing, shape (n,).
        before_s, after_s: Their times in seconds, shape (n,).
        start_s, end_s: Times of the run's first and last sample.
        starts_high: State in which the run begins.
        n_runts: Pulses that cross the mid level and return without reaching the other state.
        span: The span that the run lies in.
    """

    index: Index
    rising: BoolArray
    before: FloatArray
    after: FloatArray
    before_s: FloatArray
    after_s: FloatArray
    start_s: float
    end_s: float
    starts_high: bool
    n_runts: int
    span: Span


@frozen_record(eq=False)
class Walked:
    """What one walk over a waveform finds.

    Attributes:
        runs: Its gap-free runs.
        lengths: Typical number of samples strictly between the outer reference levels of a rising
            and of a falling transition.
        tally: Range of all samples and how many are missing.
    """

    runs: tuple[Crossings, ...]
    lengths: tuple[float, float]
    tally: Tally


@dataclass(slots=True, kw_only=True, eq=False)
class _Run:
    """What is gathered of a run while it is walked; times only where they are stamped."""

    span: Span
    start_s: float
    first_above: bool
    end_s: float = 0.0
    last: Any
    index: list[Index] = field(default_factory=list)
    before: list[Codes] = field(default_factory=list)
    after: list[Codes] = field(default_factory=list)
    before_s: list[FloatArray] = field(default_factory=list)
    after_s: list[FloatArray] = field(default_factory=list)
    settled: list[BoolArray] = field(default_factory=list)
    open_settled: bool = False


@frozen_record(eq=False)
class _Kept:
    """Which crossings are edges, the state after each, and what else the stretches tell."""

    chosen: _Choice
    ends_above: BoolArray
    begins_above: bool
    n_runts: int


def find_crossings(waveform: Waveform, limits: Thresholds) -> Walked:
    """Find the completed transitions of a waveform, walked once in blocks.

    Args:
        waveform: The trace.
        limits: Reference levels in codes.
    """
    runs: list[_Run] = []
    lengths, tally = TransitionLengths(), Tally()
    for piece in walk_pieces(waveform, tally):
        if piece.begins_run or not runs:
            runs.append(_open_run(waveform, piece, limits))
        _extend(runs[-1], waveform, piece, limits, lengths)
    rising, falling = lengths.typical()
    return Walked(
        runs=tuple(_settle(waveform, run, limits.inverted) for run in runs),
        lengths=(falling, rising) if limits.inverted else (rising, falling),
        tally=tally,
    )


def find_runs(waveform: Waveform) -> tuple[tuple[tuple[float, float], ...], Tally]:
    """Return when each gap-free run of a waveform starts and ends, in seconds, and its tally."""
    runs: list[tuple[float, float]] = []
    tally = Tally()
    for piece in walk_pieces(waveform, tally):
        ends = times_at(waveform, piece, np.array([0, piece.values.size - 1]))
        if piece.begins_run or not runs:
            runs.append((float(ends[0]), float(ends[1])))
        else:
            runs[-1] = (runs[-1][0], float(ends[1]))
    return tuple(runs), tally


def _open_run(waveform: Waveform, piece: Piece, limits: Thresholds) -> _Run:
    start_s = float(times_at(waveform, piece, np.array([0]))[0])
    first = piece.values[0]
    return _Run(
        span=piece.span,
        start_s=start_s,
        first_above=bool(first >= limits.is_above),
        last=first,
        end_s=start_s,
    )


def _extend(
    run: _Run, waveform: Waveform, piece: Piece, limits: Thresholds, lengths: TransitionLengths
) -> None:
    """Add a piece to its run: its crossings, and which stretches between them settle."""
    values = piece.values
    was_above = bool(run.last >= limits.is_above)
    found = find_changes(values, piece.rows, limits, was_above=was_above)
    settled = found.settled
    settled[0] |= run.open_settled
    run.open_settled = bool(settled[-1])
    if found.at.size:
        lengths.look(values, found.at[settled[:-1]], limits)  # the first of each transition
        run.settled.append(settled[:-1])
        _record(run, piece, found.at)
    run.last = values[-1]
    run.end_s = float(times_at(waveform, piece, np.array([values.size - 1]))[0])


def _record(run: _Run, piece: Piece, at: Index) -> None:
    before = piece.values[at - 1]
    if at[0] == 0:
        before[0] = run.last
    run.index.append(at + piece.first)
    run.before.append(before)
    run.after.append(piece.values[at])
    if piece.times_s is not None:
        before_s = piece.times_s[at - 1]
        if at[0] == 0:
            before_s[0] = run.end_s
        run.before_s.append(before_s)
        run.after_s.append(piece.times_s[at])


def _settle(waveform: Waveform, run: _Run, inverted: bool) -> Crossings:
    """Keep one crossing a completed transition: hysteresis between the reference levels."""
    settled = np.concatenate([*run.settled, [run.open_settled]])
    if settled.all():
        kept = _all_kept(settled.size - 1, run.first_above)
    else:
        kept = _middle_ones(settled, run.first_above)
    index = _taken(run.index, kept.chosen, np.int64)
    before_s, after_s = _times(waveform, run, index, kept.chosen)
    return Crossings(
        index=index,
        rising=~kept.ends_above if inverted else kept.ends_above,
        before=_taken(run.before, kept.chosen, np.float64),
        after=_taken(run.after, kept.chosen, np.float64),
        before_s=before_s,
        after_s=after_s,
        start_s=run.start_s,
        end_s=run.end_s,
        starts_high=kept.begins_above != inverted,
        n_runts=kept.n_runts,
        span=run.span,
    )


def _all_kept(n: int, first_above: bool) -> _Kept:
    """Return every crossing, where every stretch between them settles."""
    ends_above = np.zeros(n, np.bool_)
    ends_above[int(first_above) :: 2] = True
    return _Kept(chosen=slice(None), ends_above=ends_above, begins_above=first_above, n_runts=0)


def _middle_ones(settled: BoolArray, first_above: bool) -> _Kept:
    """Return the middle crossing of each transition.

    Stretch i lies between crossings i-1 and i; it is above mid where its parity says so.
    """
    firm = np.flatnonzero(settled)
    above = (firm % 2 == 0) == first_above
    turns = np.flatnonzero(above[1:] != above[:-1])
    first, last = firm[turns], firm[turns + 1] - 1  # first and last crossing of the transition
    returns = np.diff(firm)[above[1:] == above[:-1]]
    return _Kept(
        chosen=(first + last) // 2,
        ends_above=above[turns + 1] if turns.size else np.empty(0, np.bool_),
        begins_above=bool(above[0]) if firm.size else first_above,
        n_runts=int(np.sum(returns)) // 2,
    )


def _times(
    waveform: Waveform, run: _Run, index: Index, chosen: _Choice
) -> tuple[FloatArray, FloatArray]:
    """Return the times of the samples before and after the chosen crossings."""
    if not isinstance(waveform.time, UniformTime):
        return (
            _taken(run.before_s, chosen, np.float64),
            _taken(run.after_s, chosen, np.float64),
        )
    start_s, dt_s = run.span.start_s, waveform.time.dt_s
    offset = (index - run.span.start).astype(np.float64)
    return start_s + (offset - 1) * dt_s, start_s + offset * dt_s


def _taken(parts: list[NDArray[Any]], chosen: _Choice, dtype: type[np.generic]) -> NDArray[Any]:
    """Return the chosen of what was gathered, whose memory is given back."""
    if not parts:
        return np.empty(0, dtype)
    joined = np.concatenate(parts)
    parts.clear()
    return joined[chosen].astype(dtype, copy=False)
