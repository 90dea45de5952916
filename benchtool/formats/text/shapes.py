"""Rows of a few shapes, as a sign or another digit makes them: each shape is decoded at once.

Rows are told apart by their length, and those of one length by the first byte that is a digit in
some and something else in others, until all that are left together are alike.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from benchtool.formats.text.alike import extremes, parse_rows
from benchtool.formats.text.digits import Bytes
from benchtool.formats.text.rowform import RowForm
from benchtool.model.arrays import BoolArray, FloatArray, IntArray

_ZERO, _NEWLINE = ord("0"), ord("\n")
_LEAST = 400  # rows of one shape: fewer are read faster with all others
_LONGEST = 256  # bytes of a row
_MOST_SHAPES = 64
_FEW = 10  # lines to one that is chosen, for these to be taken one by one
_FEW_LENGTHS = 4  # with more of them the delimiters tell rows apart too
_ODD, _KEYS = 37, 0xFFF  # numbers of lengths and places: rarely the same for two shapes


class _Sorting:
    """Decodes what is alike and notes the rest."""

    def __init__(self, n_rows: int, form: RowForm) -> None:
        self.table = np.full((n_rows, len(form.fields)), np.nan, order="F")
        self.left = np.ones(n_rows, np.bool_)
        self._form = form
        self._n_shapes = 0

    def take(self, rows: Bytes, places: IntArray | None) -> None:
        """Take rows of one length, shape (rows, length), and where they stand; None for all."""
        n_rows = rows.shape[0]
        self._n_shapes += 1
        if n_rows < _LEAST or self._n_shapes > _MOST_SHAPES:
            return
        low, high = extremes(rows)
        odd = np.flatnonzero((low != high) & ((low < _ZERO) | (high > _ZERO + 9)))
        if odd.size:
            self._split(rows, places, int(odd[0]))
            return
        decoded = parse_rows(rows, self._form, (low, high))
        if decoded is None:
            return
        values, unsure = decoded
        left: BoolArray = np.zeros(n_rows, np.bool_)
        if unsure is not None:
            np.any(unsure, axis=1, out=left)
        if places is None:
            self.table, self.left = values, left
            return
        for column, told in zip(self.table.T, values.T, strict=True):
            column[places] = told
        self.left[places] = left

    def _split(self, rows: Bytes, places: IntArray | None, at: int) -> None:
        """Take rows apart by what stands at one byte, all digits being one thing."""
        byte = rows[:, at]
        digit = (byte - np.uint8(_ZERO)) <= 9  # smaller bytes wrap around
        key = np.where(digit, np.uint8(_ZERO), byte)
        for value in np.flatnonzero(np.bincount(key)).tolist():
            chosen = np.flatnonzero(key == value)
            if chosen.size >= _LEAST:
                inside = chosen if places is None else places[chosen]
                self.take(
                    _gathered(rows.reshape(-1), chosen * rows.shape[1], rows.shape[1]), inside
                )


def parse_mixed(text: bytes, form: RowForm) -> tuple[FloatArray, IntArray, IntArray] | None:
    """Return the numbers of rows of a few shapes.

    Args:
        text: Lines, each with its line end.
        form: The form of a row.

    Returns:
        Values, shape (lines, fields); the lines that are left to be read otherwise; one past the
        end of each line. None where no shape has many rows.
    """
    buffer = np.frombuffer(text, np.uint8)
    stops = np.flatnonzero(buffer == _NEWLINE) + 1
    lengths = np.diff(stops, prepend=0)
    if int(lengths.max()) > _LONGEST:
        return None
    counts = np.bincount(lengths)
    if counts.max() < _LEAST:
        return None
    sorting = _Sorting(stops.size, form)
    if counts.max() == stops.size:
        sorting.take(buffer.reshape(stops.size, -1), None)
    else:
        key = lengths
        if np.count_nonzero(counts >= _LEAST) > _FEW_LENGTHS:
            key = _hashed(buffer, stops - lengths, lengths, form)
        for places in _groups(key):
            length = int(lengths[places[0]])
            if (lengths[places] == length).all():
                sorting.take(_gathered(buffer, stops[places] - length, length), places)
    return sorting.table, np.flatnonzero(sorting.left), stops


def _hashed(buffer: Bytes, starts: IntArray, lengths: IntArray, form: RowForm) -> IntArray:
    """Return a number for each row that is the same where length, delimiters and signs are."""
    n_marks = form.n_fields - 1
    if len(form.mark) != 1 or form.mark == b" " or not n_marks:
        return lengths
    marks = np.flatnonzero(buffer == form.mark[0])
    if marks.size != n_marks * starts.size:
        return lengths
    key = lengths.copy()
    for k in range(n_marks):
        places = marks[k::n_marks]
        key *= _ODD
        key += places - starts
        for n in (1, 2):  # a sign, and a point after one digit
            key *= 2
            key += buffer[np.minimum(places + n, buffer.size - 1)] < _ZERO
    key &= _KEYS
    return key


def _groups(key: IntArray) -> Iterator[IntArray]:
    """Yield the rows of each key that many have."""
    order = np.argsort(key.astype(np.uint16), kind="stable")
    counts = np.bincount(key)
    ends = np.cumsum(counts)
    for value in np.flatnonzero(counts >= _LEAST).tolist():
        yield order[ends[value] - counts[value] : ends[value]]


def chosen_lines(text: bytes, chosen: IntArray, stops: IntArray) -> bytes:
    """Return some lines of a text, given one past the end of each."""
    if chosen.size < stops.size // _FEW:
        starts = np.where(chosen > 0, stops[chosen - 1], 0).tolist()
        pairs = zip(starts, stops[chosen].tolist(), strict=True)
        return b"".join([text[start:stop] for start, stop in pairs])
    kept = np.zeros(stops.size, np.bool_)
    kept[chosen] = True
    return np.frombuffer(text, np.uint8)[np.repeat(kept, np.diff(stops, prepend=0))].tobytes()


def _gathered(buffer: Bytes, starts: IntArray, length: int) -> Bytes:
    """Return the rows that begin at some bytes, shape (rows, length)."""
    windows = np.ndarray((buffer.size - length + 1,), f"V{length}", buffer.data, 0, (1,))
    return windows[starts].view(np.uint8).reshape(-1, length)
