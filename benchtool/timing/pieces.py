"""The samples of a waveform, walked block by block in gap-free pieces."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import AnyArray, FloatArray, NDArray
from benchtool.model.capture import Samples, Span, UniformTime, Waveform
from benchtool.timing.holes import bridged, finite_runs, is_finite, open_hole
from benchtool.timing.rows import ROW, Codes, Rows, find_rows
from benchtool.timing.tally import Tally

Index = NDArray[np.int64]

LEAST = 1 << 15
"""Samples that short blocks are joined to before they are searched."""


@frozen_record(eq=False)
class Piece:
    """Consecutive samples without a hole.

    Attributes:
        values: Codes or volts as stored, shape (n,).
        first: Index of the first sample in the record.
        times_s: Time of each sample where the record is stamped, shape (n,); else None.
        span: The span that the piece lies in.
        begins_run: Whether a hole or a new span lies before it.
        rows: Extremes of its rows of samples.
    """

    values: Codes
    first: int
    times_s: FloatArray | None
    span: Span
    begins_run: bool
    rows: Rows


@frozen_record(eq=False)
class Stretch:
    """Consecutive samples that were not looked at; fields as in :class:`Piece`."""

    values: Codes
    first: int
    times_s: FloatArray | None
    begins_run: bool

    def part(self, start: int, stop: int) -> Stretch:
        """Return some of them."""
        return Stretch(
            values=self.values[start:stop],
            first=self.first + start,
            times_s=None if self.times_s is None else self.times_s[start:stop],
            begins_run=self.begins_run and start == 0,
        )


def walk_pieces(waveform: Waveform, tally: Tally | None = None) -> Iterator[Piece]:
    """Yield the waveform in order, split at its spans and at rows of missing samples.

    Args:
        waveform: The trace; up to ``BRIDGE`` missing samples in a row are bridged.
        tally: Takes note of the range and of missing samples on the way.
    """
    tally = tally or Tally()
    for span in waveform.spans:
        begins = True
        for block in _walk_span(waveform, span, tally):
            for piece in _split(block, span, begins=begins):
                yield piece
                begins = False
            begins = begins or not is_finite(block.values[-1])


def walk_stretches(waveform: Waveform, *, holed: bool) -> Iterator[Stretch]:
    """Yield the pieces of a waveform; where none of its samples is missing, without looking.

    Args:
        waveform: The trace.
        holed: Whether samples of it are missing.
    """
    if holed:
        for piece in walk_pieces(waveform):
            yield Stretch(
                values=piece.values,
                first=piece.first,
                times_s=piece.times_s,
                begins_run=piece.begins_run,
            )
        return
    for span in waveform.spans:
        first = span.start
        for values, times_s in _paired_blocks(waveform, span):
            yield Stretch(
                values=values, first=first, times_s=times_s, begins_run=first == span.start
            )
            first += values.size


def cut_pieces(pieces: Iterable[Piece], length: int) -> Iterator[Piece]:
    """Yield the pieces cut to a length, a multiple of ``ROW``, for one who holds much a sample."""
    for piece in pieces:
        for at in range(0, piece.values.size, length):
            rows = slice(at // ROW, (at + length) // ROW)
            yield Piece(
                values=piece.values[at : at + length],
                first=piece.first + at,
                times_s=None if piece.times_s is None else piece.times_s[at : at + length],
                span=piece.span,
                begins_run=piece.begins_run and at == 0,
                rows=Rows(least=piece.rows.least[rows], greatest=piece.rows.greatest[rows]),
            )


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


@frozen_record(eq=False)
class _Block:
    """Samples in a row whose short holes are bridged; ``rows`` where none is missing."""

    values: Codes
    first: int
    times_s: FloatArray | None
    rows: Rows | None


def _split(block: _Block, span: Span, *, begins: bool) -> Iterator[Piece]:
    """Yield the pieces between the holes of a block."""
    runs = finite_runs(block.values) if block.rows is None else [(0, block.values.size)]
    for start, stop in runs:
        values = block.values[start:stop]
        yield Piece(
            values=values,
            first=block.first + start,
            times_s=None if block.times_s is None else block.times_s[start:stop],
            span=span,
            begins_run=begins or start > 0,
            rows=block.rows or find_rows(values),
        )


def _walk_span(waveform: Waveform, span: Span, tally: Tally) -> Iterator[_Block]:
    """Yield blocks whose short holes are bridged, also those that two blocks share."""
    held: tuple[Codes, FloatArray | None] | None = None
    before: float | None = None
    first = span.start
    for values, times_s in _paired_blocks(waveform, span):
        joined, joined_s = _join(held, values, times_s)
        rows: Rows | None = find_rows(joined)
        if rows is not None and rows.are_whole:
            tally.add_rows(rows)
            yield _Block(values=joined, first=first, times_s=joined_s, rows=rows)
            held, before, keep = None, float(joined[-1]), joined.size
        else:
            keep = joined.size - open_hole(joined)
            held = (joined[keep:], None if joined_s is None else joined_s[keep:])
            if keep:
                tally.add_holed(joined[:keep])
                filled = bridged(joined[:keep], before)
                kept_s = None if joined_s is None else joined_s[:keep]
                yield _Block(values=filled, first=first, times_s=kept_s, rows=None)
                before = float(filled[-1]) if is_finite(filled[-1]) else None
        first += keep
    if held is not None and held[0].size:
        tally.add_holed(held[0])
        yield _Block(values=held[0], first=first, times_s=held[1], rows=None)


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
    values = (_plain(block) for block in _long_blocks(waveform.samples, span))
    if isinstance(waveform.time, UniformTime):
        for block in values:
            yield block, None
        return
    stamps = _Reader(waveform.time.stamps, span)
    for block in values:
        yield block, stamps.take(block.size)


def _long_blocks(samples: Samples, span: Span) -> Iterator[AnyArray]:
    """Yield the blocks as they come, short ones joined."""
    held: list[AnyArray] = []
    size = 0
    for block in samples.blocks(span.start, span.stop):
        held.append(block)
        size += block.size
        if size >= LEAST:
            yield held[0] if len(held) == 1 else np.concatenate(held)
            held, size = [], 0
    if size:
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


def _plain(block: AnyArray) -> Codes:
    """Return samples as an array of numbers: no subclass, whose every slice costs, no bool."""
    values = np.asarray(block)
    return values.view(np.uint8) if values.dtype.kind == "b" else values
