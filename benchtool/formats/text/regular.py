"""Where the cells of a block lie, and which of its lines have another number of them."""

from __future__ import annotations

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, IntArray

_NEWLINE, _BLANK = 10, 32
_NONE = np.empty(0, np.int64)


@frozen_record(eq=False)
class Cells:
    """The cells of the regular lines of a block.

    Attributes:
        starts: Where each begins, shape (regular lines, fields).
        stops: One past where it ends.
        n_lines: Lines of the block, regular or not.
        odd: Lines with another number of cells, in order.
    """

    starts: IntArray
    stops: IntArray
    n_lines: int
    odd: IntArray


def find_cells(text: bytes, mark: bytes, n_fields: int) -> Cells:
    """Find the cells of a block of whole lines.

    Args:
        text: Lines, each with its line end.
        mark: The delimiter; a blank for runs of blanks, empty where there is one column.
        n_fields: Cells of a regular line.
    """
    buffer = np.frombuffer(text, np.uint8)
    newline = buffer == _NEWLINE
    if mark == b" ":
        starts, stops = _tokens(buffer > _BLANK)
        return _by_line(starts, stops, starts, np.flatnonzero(newline), n_fields)
    stops = np.flatnonzero(newline | (buffer == mark[0])) if mark else np.flatnonzero(newline)
    starts = np.empty_like(stops)
    starts[0], starts[1:] = 0, stops[:-1] + 1
    n_lines, rest = divmod(stops.size, n_fields)
    if (
        not rest
        and np.count_nonzero(newline) == n_lines
        and newline[stops[n_fields - 1 :: n_fields]].all()
    ):
        shape = (n_lines, n_fields)
        return Cells(
            starts=starts.reshape(shape), stops=stops.reshape(shape), n_lines=n_lines, odd=_NONE
        )
    return _by_line(starts, stops, stops, np.flatnonzero(newline), n_fields)


def _tokens(inside: BoolArray) -> tuple[IntArray, IntArray]:
    """Return where runs of True begin and end; the last byte is outside."""
    changes = np.flatnonzero(inside[1:] != inside[:-1]) + 1
    if inside[0]:
        changes = np.concatenate([[0], changes])
    return changes[::2], changes[1::2]


def _by_line(
    starts: IntArray, stops: IntArray, places: IntArray, lines: IntArray, n_fields: int
) -> Cells:
    """Keep the cells of lines that have as many as they should."""
    until = np.searchsorted(places, lines, side="right")
    counts = np.diff(until, prepend=0)
    regular = counts == n_fields
    kept = np.repeat(regular, counts)
    shape = (-1, n_fields)
    return Cells(
        starts=starts[kept].reshape(shape),
        stops=stops[kept].reshape(shape),
        n_lines=lines.size,
        odd=np.flatnonzero(~regular),
    )
