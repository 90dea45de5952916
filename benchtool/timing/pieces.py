"""The samples of a waveform, walked block by block in gap-free pieces."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, NDArray
from benchtool.model.capture import Samples, Span, UniformTime, Waveform

Codes = NDArray[Any]
"""Samples as stored: integer codes, or floating volts."""

Index = NDArray[np.int64]

LEAST = 1 << 15
"""Samples that short blocks are joined to before they are searched."""

BRIDGE = 3
"""Longest row of missing samples that is bridged by a straight line instead of split."""


@frozen_record(eq=False)
class Piece:
    """Consecutive samples without a hole.

    Attributes:
        values: Codes or volts as stored, shape (n,).
        first: Index of the first sample in the record.
        times_s: Time of each sample where the record is stamped, shape (n,); else None.
        span: The span that the piece lies in.
        begins_run: Whether a hole or a new span lies before it.
    """

    values: Codes
    first: int
    times_s: FloatArray | None
    span: Span
    begins_run: bool


def walk_pieces(waveform: Waveform) -> Iterator[Piece]:
    """Yield the waveform in order, split at its spans and at rows of missing samples.

    Args:
        waveform: The trace; up to ``BRIDGE`` missing samples in a row are bridged.
    """
    for span in waveform.spans:
        begins = True
        for first, values, times_s in _walk_span(waveform, span):
            for start, stop in _finite_runs(values):
                yield Piece(
                    values=values[start:stop],
                    first=first + start,
                    times_s=None if times_s is None else times_s[start:stop],
                    span=span,
                    begins_run=begins or start > 0,
                )
                begins = stop < values.size
            begins = begins or (values.size > 0 and not _is_finite(values[-1]))


def piece_times(waveform: Waveform, piece: Piece) -> FloatArray:
    """Return the times of a piece's samples in seconds, shape (n,)."""
    return times_at(waveform, piece, np.arange(piece.values.size))


def times_at(waveform: Waveform, piece: Piece, positions: Index) -> FloatArray:
    """Return the times of some samples of a piece, given by their positions in it, in seconds.

    Raises:
        TypeError: If a stamped waveform's piece came without its times.
    """
    if piece.times_s is not None:
        return piece.times_s[positions]
    if not isinstance(waveform.time, UniformTime):
        raise TypeError("a stamped waveform has a time for each sample of its pieces")
    offset = piece.first - piece.span.start
    return piece.span.start_s + (offset + positions).astype(np.float64) * waveform.time.dt_s


def _walk_span(waveform: Waveform, span: Span) -> Iterator[tuple[int, Codes, FloatArray | None]]:
    """Yield blocks whose short holes are bridged, also those that two blocks share."""
    held: tuple[Codes, FloatArray | None] | None = None
    before: float | None = None
    first = span.start
    for values, times_s in _paired_blocks(waveform, span):
        joined, joined_s = _join(held, values, times_s)
        keep = joined.size - _open_hole(joined)
        held = (joined[keep:], None if joined_s is None else joined_s[keep:])
        if keep:
            bridged = _bridged(joined[:keep], before)
            yield first, bridged, None if joined_s is None else joined_s[:keep]
            before = float(bridged[-1]) if _is_finite(bridged[-1]) else None
        first += keep
    if held is not None and held[0].size:
        yield first, held[0], held[1]


def _join(
    held: tuple[Codes, FloatArray | None] | None,
    values: Codes,
    times_s: FloatArray | None,
) -> tuple[Codes, FloatArray | None]:
    if held is None or held[0].size == 0:
        return values, times_s
    stamps = None
    if times_s is not None and held[1] is not None:
        stamps = np.concatenate([held[1], times_s])
    return np.concatenate([held[0], values]), stamps


def _paired_blocks(waveform: Waveform, span: Span) -> Iterator[tuple[Codes, FloatArray | None]]:
    values = _long_blocks(waveform.samples, span)
    if isinstance(waveform.time, UniformTime):
        for block in values:
            yield block, None
        return
    stamps = _Reader(waveform.time.stamps, span)
    for block in values:
        yield block, stamps.take(block.size)


def _long_blocks(samples: Samples, span: Span) -> Iterator[Codes]:
    """Yield the blocks as they come, short ones joined."""
    held: list[Codes] = []
    size = 0
    for block in samples.blocks(span.start, span.stop):
        held.append(block)
        size += block.size
        if size >= LEAST:
            yield held[0] if len(held) == 1 else np.concatenate(held)
            held, size = [], 0
    if held:
        yield held[0] if len(held) == 1 else np.concatenate(held)


class _Reader:
    """Takes stamps in whatever lengths the sample blocks have."""

    def __init__(self, stamps: Samples, span: Span) -> None:
        self._blocks = stamps.blocks(span.start, span.stop)
        self._rest: FloatArray = np.empty(0)

    def take(self, n: int) -> FloatArray:
        while self._rest.size < n:
            block = next(self._blocks).astype(np.float64)
            self._rest = np.concatenate([self._rest, block]) if self._rest.size else block
        taken, self._rest = self._rest[:n], self._rest[n:]
        return taken


def _is_finite(value: np.generic) -> bool:
    return bool(np.isfinite(value))


def _has_holes(values: Codes) -> bool:
    """Tell whether any sample is missing: one pass, since NaN and infinities survive a sum."""
    if values.dtype.kind != "f" or values.size == 0:
        return False
    with np.errstate(all="ignore"):
        return not _is_finite(values.min() + values.max())


def _open_hole(values: Codes) -> int:
    """Return how many missing samples at the end may belong to a hole that is still short."""
    if values.dtype.kind != "f" or values.size == 0 or _is_finite(values[-1]):
        return 0
    present = np.flatnonzero(np.isfinite(values[-(BRIDGE + 1) :]))
    missing = min(values.size, BRIDGE + 1) - (int(present[-1]) + 1 if present.size else 0)
    return missing if missing <= BRIDGE else 0


def _holes(missing: Codes) -> list[tuple[int, int]]:
    ends = np.flatnonzero(np.diff(np.concatenate([[False], missing, [False]]).astype(np.int8)))
    return [(int(a), int(b)) for a, b in ends.reshape(-1, 2)]


def _bridged(values: Codes, before: float | None) -> Codes:
    """Fill short holes between present samples by straight lines.

    Args:
        values: Samples.
        before: The present sample just before them, None where there is none.
    """
    if not _has_holes(values):
        return values
    missing = ~np.isfinite(values)
    short = [
        np.arange(a, b)
        for a, b in _holes(missing)
        if b - a <= BRIDGE and b < values.size and (a > 0 or before is not None)
    ]
    if not short:
        return values
    where, present = np.concatenate(short), np.flatnonzero(~missing)
    known = values[present]
    if before is not None:
        present, known = np.concatenate([[-1], present]), np.concatenate([[before], known])
    filled = values.copy()
    filled[where] = np.interp(where, present, known)
    return filled


def _finite_runs(values: Codes) -> list[tuple[int, int]]:
    if not _has_holes(values):
        return [(0, values.size)] if values.size else []
    return _holes(np.isfinite(values))
