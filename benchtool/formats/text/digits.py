"""Decimal numbers of rows that look alike, by whole-array arithmetic, bit for bit as ``float``.

Rows are alike where they differ in nothing but which digits they hold. One row of each kind is
read by the rules; of the others only the digits are gathered. A decimal number is a whole
mantissa and a power of ten; where the mantissa is below 2**53 and the power within 10**22 both
are exact in binary, so that one multiplication or division rounds once and correctly
(W. D. Clinger, "How to read floating point numbers accurately", PLDI 1990).
"""

from __future__ import annotations

import re
from collections.abc import Iterator

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, NDArray

Bytes = NDArray[np.uint8]

_MOST_KINDS = 48
_SHORT = 9  # digits that fit uint32
_MOST_DIGITS = 15  # any mantissa of so many digits is below 2**53
_EXACT_POWER = 22  # 10**22 is the last power of ten that is exact in a float
_TENS = 10.0 ** np.arange(_EXACT_POWER + 1)
_ZERO, _NEWLINE = ord("0"), ord("\n")
_NUMBERS = {
    mark: re.compile(rb"([+-]?)(\d*)(?:" + re.escape(mark) + rb"(\d*))?(?:[eE]([+-]?)(\d+))?")
    for mark in (b".", b",")
}
_BLANKED = re.compile(rb"\S+")


@frozen_record(eq=False)
class Number:
    """Where the digits of one number stand in the rows of a kind.

    Attributes:
        negative: Whether it has a minus sign.
        digits: Places of its mantissa's digits.
        n_fraction: How many of them come after the mark.
        exponent: Places of its exponent's digits.
        divides: Whether the exponent has a minus sign.
    """

    negative: bool
    digits: tuple[int, ...]
    n_fraction: int
    exponent: tuple[int, ...] = ()
    divides: bool = False


@frozen_record(eq=False)
class RowForm:
    """The form that rows must have: delimiter, decimal mark, number of fields, those wanted."""

    mark: bytes
    decimal: bytes
    n_fields: int
    fields: tuple[int, ...]


def parse_alike(block: bytes, form: RowForm) -> FloatArray | None:
    """Return the numbers of a block of whole lines; None where its rows are of too many kinds.

    Args:
        block: Lines, each with its line end.
        form: The form of a row.

    Returns:
        Values, shape (lines, fields), or None where some row needs another way of reading.
    """
    buffer = np.frombuffer(block, np.uint8)
    stops = np.flatnonzero(buffer == _NEWLINE)
    starts = np.concatenate([[0], stops[:-1] + 1])
    table = np.empty((stops.size, len(form.fields)))
    budget = _MOST_KINDS
    for rows, columns in _same_length(buffer, starts, stops):
        for alike, kind in _kinds(columns):
            values = _parse_kind(kind, form)
            budget -= 1
            if values is None or budget < 0:
                return None
            table[rows[alike]] = values
    return table


def _same_length(
    buffer: Bytes, starts: NDArray[np.intp], stops: NDArray[np.intp]
) -> Iterator[tuple[NDArray[np.intp], Bytes]]:
    """Yield row numbers and bytes, shape (length, rows), of the rows of each length."""
    lengths = stops - starts
    for length in np.flatnonzero(np.bincount(lengths)):
        rows = np.flatnonzero(lengths == length)
        if length == 0:
            yield rows, np.empty((0, rows.size), np.uint8)
            continue
        windows = sliding_window_view(buffer, int(length))
        yield rows, np.ascontiguousarray(windows[starts[rows]].T)


def _kinds(columns: Bytes) -> Iterator[tuple[NDArray[np.intp], Bytes]]:
    """Yield the rows of each kind, equal but for the digits: their numbers and their bytes."""
    left = np.arange(columns.shape[1])
    while left.size:
        alike = np.ones(left.size, bool)
        for column in columns:
            model = column[0]
            if _ZERO <= model < _ZERO + 10:
                alike &= column - np.uint8(_ZERO) < 10
            else:
                alike &= column == model
        if alike.all():
            yield left, columns
            return
        yield left[alike], columns[:, alike]
        left, columns = left[~alike], columns[:, ~alike]


def _parse_kind(columns: Bytes, form: RowForm) -> FloatArray | None:
    """Return the numbers of rows that are alike."""
    numbers = _read_form(columns[:, 0].tobytes(), form)
    if numbers is None:
        return None
    values = np.empty((columns.shape[1], len(numbers)))
    for k, number in enumerate(numbers):
        column = _values(columns, number)
        if column is None:
            return None
        values[:, k] = column
    return values


def _read_form(row: bytes, form: RowForm) -> list[Number] | None:
    """Find the digits of the wanted fields in one row; None if it is no row of the form."""
    spans = _spans(row, form.mark)
    if len(spans) != form.n_fields:
        return None
    numbers = []
    for field in form.fields:
        number = _number(row, *spans[field], form.decimal)
        if number is None:
            return None
        numbers.append(number)
    return numbers


def _spans(row: bytes, mark: bytes) -> list[tuple[int, int]]:
    """Return where the cells of a row begin and end."""
    if mark == b" ":
        return [match.span() for match in _BLANKED.finditer(row)]
    if not mark:
        return [(0, len(row))]
    stops = [i for i, byte in enumerate(row) if byte == mark[0]]
    return list(zip([0, *(i + 1 for i in stops)], [*stops, len(row)], strict=True))


def _number(row: bytes, start: int, stop: int, decimal: bytes) -> Number | None:
    cell = row[start:stop]
    text = cell.strip().removeprefix(b'"').removesuffix(b'"').strip()
    match = _NUMBERS[decimal].fullmatch(text)
    if match is None or not (match[2] or match[3]):
        return None
    at = start + cell.index(text)
    digits = [*range(*match.span(2)), *range(*match.span(3))]
    if len(digits) > _MOST_DIGITS:
        return None
    return Number(
        negative=match[1] == b"-",
        digits=tuple(at + i for i in digits),
        n_fraction=len(match[3] or b""),
        exponent=tuple(at + i for i in range(*match.span(5))) if match[5] else (),
        divides=match[4] == b"-",
    )


def _whole(columns: Bytes, places: tuple[int, ...]) -> NDArray[np.int64]:
    """Return the whole numbers whose digits stand at ``places``."""
    whole = np.zeros(columns.shape[1], np.int64)
    for start in range(0, len(places), _SHORT):
        few = places[start : start + _SHORT]
        part = np.zeros(columns.shape[1], np.uint32)
        for place in few:
            part *= np.uint32(10)
            part += columns[place] - np.uint8(_ZERO)
        whole = whole * 10 ** len(few) + part
    return whole


def _values(columns: Bytes, number: Number) -> FloatArray | None:
    """Put mantissa and power together; None where the power is not exact in a float."""
    mantissa = _whole(columns, number.digits).astype(np.float64)
    if number.exponent:
        if len(number.exponent) > 3:
            return None
        power = _whole(columns, number.exponent)
        power = (-power if number.divides else power) - number.n_fraction
        if np.abs(power).max() > _EXACT_POWER:
            return None
        scale = _TENS[np.abs(power)]
        values: FloatArray = np.where(power < 0, mantissa / scale, mantissa * scale)
    else:
        values = mantissa / _TENS[number.n_fraction]
    return -values if number.negative else values
