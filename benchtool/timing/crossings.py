"""Crossings of the mid level, found block by block in the samples' own codes."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, FloatArray, NDArray
from benchtool.model.capture import Span, Waveform
from benchtool.timing.lengths import TransitionLengths
from benchtool.timing.pieces import Codes, Index, Piece, times_at, walk_pieces
from benchtool.timing.thresholds import Thresholds

ROW = 2048
"""Samples in a row of the search for rows that hold a crossing."""


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


@dataclass(slots=True, kw_only=True, eq=False)
class _Run:
    """What is gathered of a run while it is walked."""

    span: Span
    start_s: float
    first_above: bool
    end_s: float = 0.0
    last: float = 0.0
    index: list[Index] = field(default_factory=list)
    before: list[FloatArray] = field(default_factory=list)
    after: list[FloatArray] = field(default_factory=list)
    before_s: list[FloatArray] = field(default_factory=list)
    after_s: list[FloatArray] = field(default_factory=list)
    settled: list[BoolArray] = field(default_factory=list)
    open_settled: bool = False


def find_crossings(
    waveform: Waveform, limits: Thresholds
) -> tuple[tuple[Crossings, ...], tuple[float, float]]:
    """Find the completed transitions of a waveform.

    Args:
        waveform: The trace, walked once in blocks.
        limits: Reference levels in codes.

    Returns:
        The runs, and the typical number of samples strictly between the outer reference levels
        of a rising and of a falling transition.
    """
    runs: list[_Run] = []
    lengths = TransitionLengths()
    for piece in walk_pieces(waveform):
        if piece.begins_run or not runs:
            runs.append(_open_run(waveform, piece, limits))
        _extend(runs[-1], waveform, piece, limits, lengths)
    settled = tuple(_settle(run, limits.inverted) for run in runs)
    rising, falling = lengths.typical()
    return settled, (falling, rising) if limits.inverted else (rising, falling)


def find_runs(waveform: Waveform) -> tuple[tuple[float, float], ...]:
    """Return when each gap-free run of a waveform starts and ends, in seconds."""
    runs: list[tuple[float, float]] = []
    for piece in walk_pieces(waveform):
        ends = times_at(waveform, piece, np.array([0, piece.values.size - 1]))
        if piece.begins_run or not runs:
            runs.append((float(ends[0]), float(ends[1])))
        else:
            runs[-1] = (runs[-1][0], float(ends[1]))
    return tuple(runs)


def _open_run(waveform: Waveform, piece: Piece, limits: Thresholds) -> _Run:
    start_s = float(times_at(waveform, piece, np.array([0]))[0])
    first = float(piece.values[0])
    return _Run(
        span=piece.span, start_s=start_s, first_above=first >= limits.mid, last=first, end_s=start_s
    )


def _extend(
    run: _Run, waveform: Waveform, piece: Piece, limits: Thresholds, lengths: TransitionLengths
) -> None:
    """Add a piece to its run: its crossings, and which stretches between them settle."""
    values = piece.values
    mid = _as_type(math.ceil(limits.mid), limits.mid, values)
    at = _changes(values, mid)
    last_above = run.last >= limits.mid
    if (values[0] >= mid) != last_above:
        at = np.concatenate([[0], at])
    lengths.look(values, at, limits)
    _settle_stretches(run, values, at, limits)
    if at.size:
        _record(run, waveform, piece, at)
    run.last = float(values[-1])
    run.end_s = float(times_at(waveform, piece, np.array([values.size - 1]))[0])


def _as_type(whole: int, exact: float, values: Codes) -> Any:
    """Return a threshold in the samples' own type: a wider scalar would slow the comparison."""
    if values.dtype.kind in "iu":
        info = np.iinfo(np.dtype(values.dtype.str))
        return values.dtype.type(min(max(whole, info.min), info.max))
    return values.dtype.type(exact)


def _changes(values: Codes, mid: Any) -> Index:
    """Return the positions whose sample lies on the other side of ``mid`` than the one before."""
    if values.dtype.kind in "iu" and values.size > 4 * ROW:
        rows = _rows_with_crossings(values, mid)
        if rows.size * 8 < values.size // ROW:
            found = [_row_changes(values, int(row) * ROW, mid) for row in rows]
            return np.concatenate(found) if found else np.empty(0, np.int64)
    above = values >= mid
    return np.flatnonzero(above[1:] != above[:-1]) + 1


def _rows_with_crossings(values: Codes, mid: Any) -> Index:
    """Return rows that hold, or begin with, a change of side."""
    starts = np.arange(0, values.size, ROW)
    least = np.minimum.reduceat(values, starts) >= mid
    greatest = np.maximum.reduceat(values, starts) >= mid
    mixed = least != greatest
    mixed[1:] |= (values[starts[1:]] >= mid) != (values[starts[1:] - 1] >= mid)
    return np.flatnonzero(mixed)


def _row_changes(values: Codes, start: int, mid: Any) -> Index:
    """Return the changes whose later sample lies in the row."""
    first = max(start - 1, 0)
    above = values[first : start + ROW] >= mid
    return np.flatnonzero(above[1:] != above[:-1]) + first + 1


def _settle_stretches(run: _Run, values: Codes, at: Index, limits: Thresholds) -> None:
    """Note for each stretch between crossings whether it reaches its outer reference level."""
    above_now = run.last >= limits.mid
    if not at.size:
        run.open_settled = run.open_settled or _reaches(values, above_now, limits)
        return
    if at[0] > 0:
        run.open_settled = run.open_settled or _reaches(values[: at[0]], above_now, limits)
    body = values[at[0] :]
    greatest = np.maximum.reduceat(body, at - at[0]) >= limits.upper
    least = np.minimum.reduceat(body, at - at[0]) <= limits.lower
    is_above = np.arange(at.size) % 2 == (1 if above_now else 0)
    settled = np.where(is_above, greatest, least)
    run.settled.append(np.concatenate([[run.open_settled], settled[:-1]]))
    run.open_settled = bool(settled[-1])


def _reaches(values: Codes, above: bool, limits: Thresholds) -> bool:
    if above:
        return bool(values.max() >= limits.upper)
    return bool(values.min() <= limits.lower)


def _record(run: _Run, waveform: Waveform, piece: Piece, at: Index) -> None:
    values = piece.values
    before = values[np.maximum(at - 1, 0)].astype(np.float64)
    times = times_at(waveform, piece, at)
    before_s = times_at(waveform, piece, np.maximum(at - 1, 0))
    if at[0] == 0:
        before[0], before_s[0] = run.last, run.end_s
    run.index.append(at + piece.first)
    run.before.append(before)
    run.after.append(values[at].astype(np.float64))
    run.before_s.append(before_s)
    run.after_s.append(times)


def _settle(run: _Run, inverted: bool) -> Crossings:
    """Keep one crossing a completed transition: hysteresis between the reference levels."""
    index = _joined(run.index, np.int64)
    settled = np.concatenate([_joined(run.settled, np.bool_), [run.open_settled]])
    # Stretch i lies between crossings i-1 and i; it is above mid where its parity says so.
    above = (np.arange(settled.size) % 2 == 0) == run.first_above
    firm = np.flatnonzero(settled)
    turns = np.flatnonzero(above[firm][1:] != above[firm][:-1])
    first, last = firm[turns], firm[turns + 1] - 1  # first and last crossing of the transition
    middle = (first + last) // 2
    rising = above[firm[turns + 1]] != inverted if turns.size else np.empty(0, np.bool_)
    begins = above[firm[0]] if firm.size else above[0]
    returns = np.diff(firm)[above[firm][1:] == above[firm][:-1]]
    return Crossings(
        index=index[middle],
        rising=rising,
        before=_joined(run.before, np.float64)[middle],
        after=_joined(run.after, np.float64)[middle],
        before_s=_joined(run.before_s, np.float64)[middle],
        after_s=_joined(run.after_s, np.float64)[middle],
        start_s=run.start_s,
        end_s=run.end_s,
        starts_high=bool(begins != inverted),
        n_runts=int(np.sum(returns)) // 2,
        span=run.span,
    )


def _joined(parts: Sequence[NDArray[Any]], dtype: type[np.generic]) -> NDArray[Any]:
    return np.concatenate(parts) if parts else np.empty(0, dtype)
