"""Rows of one width that differ in nothing but their digits: numbers straight from the bytes.

One row is read by the rules; all others are held against it, byte for byte, by whole-array
arithmetic. What is left of a row less the model is its digits, and those of a field are folded
from words of eight bytes at places that are the same in all rows.
"""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from benchtool.formats.text.digits import Bytes, Words, fold, scaled
from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, FloatArray, IntArray

WORD = 8
KEEP = np.array([((1 << 8 * n) - 1) << 8 * (WORD - n) for n in range(WORD + 1)], np.uint64)
"""Masks that keep the last n bytes of a word."""

_ZERO = ord("0")
_STRIP = 128  # rows of a model
_NEAR = 6144  # rows decoded at a time: few enough to stay in the cache
_MOST_WORDS = 3
_MOST_DIGITS = 19  # any number of so many digits is below 2**64
_DIGITS = bytes(range(_ZERO, _ZERO + 10))
_SHAPE = bytes.maketrans(_DIGITS, b"0" * 10)


@frozen_record
class RowForm:
    """The form that rows must have: delimiter, decimal mark, number of fields, those wanted."""

    mark: bytes
    decimal: bytes
    n_fields: int
    fields: tuple[int, ...]


@frozen_record(eq=False)
class Chunk:
    """Up to eight bytes of a number: where they end in the row, and which are digits.

    Attributes:
        stop: One past its last byte.
        before: Mask of the digits before the decimal mark, which move up by a byte.
        after: Mask of the other digits.
        tens: Power of ten of its last digit.
    """

    stop: int
    before: np.uint64
    after: np.uint64
    tens: np.uint64


@frozen_record(eq=False)
class Number:
    """Where the digits of one number stand in all rows.

    Attributes:
        negative: Whether it has a minus sign.
        mantissa: Its digits, the last ones first.
        n_fraction: How many of them come after the mark.
        exponent: The digits of its exponent.
        divides: Whether the exponent has a minus sign.
    """

    negative: bool
    mantissa: tuple[Chunk, ...]
    n_fraction: int
    exponent: Chunk | None = None
    divides: bool = False


@frozen_record(eq=False)
class Model:
    """What rows are held against: the bytes of ``_STRIP`` rows with zeros for their digits."""

    bytes: Bytes
    most: Bytes
    numbers: tuple[Number, ...]


def parse_alike(text: bytes, form: RowForm) -> tuple[FloatArray, BoolArray | None] | None:
    """Return the numbers of rows that are alike; None where some row is not.

    Args:
        text: Lines, each with its line end.
        form: The form of a row.

    Returns:
        Values, shape (lines, fields), and which of them are not sure to be rounded correctly.
    """
    width = text.find(b"\n") + 1
    n_rows, rest = divmod(len(text), width)
    if rest or text[-width:].translate(_SHAPE) != text[:width].translate(_SHAPE):
        return None
    model = _model(text[:width].translate(_SHAPE), form)
    if model is None:
        return None
    buffer = np.frombuffer(text, np.uint8)
    table = np.empty((n_rows, len(model.numbers)), order="F")
    unsure: BoolArray | None = None
    for first in range(0, n_rows, _NEAR):
        last = min(first + _NEAR, n_rows)
        digits = _less_model(buffer[first * width : last * width], model, width)
        if digits is None:
            return None
        doubt = _fill(table[first:last], digits, width, model)
        if doubt is not None:
            unsure = np.zeros(table.shape, np.bool_) if unsure is None else unsure
            unsure[first:last] = doubt
    return table, unsure


def _less_model(buffer: Bytes, model: Model, width: int) -> Bytes | None:
    """Return the digits, eight bytes of room before them; None if a row departs from the model."""
    digits = np.empty(buffer.size + WORD, np.uint8)
    strip = model.bytes.size
    whole = buffer.size // strip * strip
    for start, stop, size in ((0, whole, strip), (whole, buffer.size, width)):
        if start == stop:
            continue
        rows = digits[WORD + start : WORD + stop].reshape(-1, size)
        np.subtract(buffer[start:stop].reshape(-1, size), model.bytes[:size], out=rows)
        if (rows > model.most[:size]).any():
            return None
    return digits


def _fill(table: FloatArray, digits: Bytes, width: int, model: Model) -> BoolArray | None:
    """Fill in the numbers of rows; return which are not sure to be rounded correctly, if any."""
    n_rows = table.shape[0]
    unsure: BoolArray | None = None
    for k, number in enumerate(model.numbers):
        mantissa = _whole(digits, n_rows, width, number.mantissa)
        values, doubt = scaled(mantissa, _power(digits, n_rows, width, number))
        table[:, k] = -values if number.negative else values
        if doubt is not None and doubt.any():
            unsure = np.zeros(table.shape, np.bool_) if unsure is None else unsure
            unsure[:, k] = doubt
    return unsure


def _power(digits: Bytes, n_rows: int, width: int, number: Number) -> int | IntArray:
    if number.exponent is None:
        return -number.n_fraction
    exponent = _whole(digits, n_rows, width, (number.exponent,)).view(np.int64)
    return (-exponent if number.divides else exponent) - number.n_fraction


def _whole(digits: Bytes, n_rows: int, width: int, chunks: tuple[Chunk, ...]) -> Words:
    """Return the whole numbers that chunks of the rows spell."""
    whole: Words | None = None
    for chunk in chunks:
        at = np.ndarray((n_rows,), "<u8", digits.data, chunk.stop, (width,))
        part = at & chunk.after
        if chunk.before:
            part |= (at & chunk.before) << np.uint64(8)
        part = fold(part)
        if whole is None:
            whole = part
        else:
            part *= chunk.tens
            whole += part
    assert whole is not None
    return whole


@lru_cache(maxsize=64)
def _model(shape: bytes, form: RowForm) -> Model | None:
    """Read a row whose digits are all 0; None if it is no row of the form."""
    spans = _spans(shape, form.mark)
    if len(spans) != form.n_fields:
        return None
    numbers = [_number(shape, *spans[field], form.decimal) for field in form.fields]
    if any(number is None for number in numbers):
        return None
    row = np.frombuffer(shape, np.uint8)
    return Model(
        bytes=np.tile(row, _STRIP),
        most=np.tile(np.where(row == _ZERO, 9, 0).astype(np.uint8), _STRIP),
        numbers=tuple(number for number in numbers if number is not None),
    )


def _spans(row: bytes, mark: bytes) -> list[tuple[int, int]]:
    """Return where the cells of a row begin and end."""
    cells: list[tuple[int, int]] = []
    at = 0
    body = row[:-1]
    for cell in body.split() if mark == b" " else body.split(mark) if mark else [body]:
        start = body.index(cell, at) if mark == b" " else at
        cells.append((start, start + len(cell)))
        at = start + len(cell) + len(mark)
    return cells


def _number(row: bytes, start: int, stop: int, decimal: bytes) -> Number | None:
    """Find the digits of a cell; None if it holds no plain number."""
    cell = row[start:stop]
    text = cell.strip().removeprefix(b'"').removesuffix(b'"').strip()
    at = start + cell.find(text)
    negative, signed = text.startswith(b"-"), text.startswith((b"-", b"+"))
    mantissa, e, exponent = text[signed:].replace(b"E", b"e").partition(b"e")
    whole, point, fraction = mantissa.partition(decimal)
    figures = exponent[1:] if exponent.startswith((b"-", b"+")) else exponent
    n_digits = len(whole) + len(fraction)
    if not (whole + fraction).isdigit() or n_digits > _MOST_DIGITS:
        return None
    if e and not (figures.isdigit() and len(figures) <= 3):
        return None
    begins = at + signed
    hole = begins + len(whole) if point else None
    chunks = cut_chunks(begins, begins + len(mantissa), hole)
    end = at + len(text)
    return Number(
        negative=negative,
        mantissa=chunks,
        n_fraction=len(fraction),
        exponent=cut_chunks(end - len(figures), end, None)[0] if e else None,
        divides=exponent.startswith(b"-"),
    )


def cut_chunks(start: int, stop: int, hole: int | None) -> tuple[Chunk, ...]:
    """Cut the bytes from ``start`` to ``stop`` into words, the last first."""
    chunks = []
    n_later = 0
    while stop > start:
        n = min(WORD, stop - start)
        mask = int(KEEP[n])
        inside = hole is not None and stop - n <= hole < stop
        place = WORD - (stop - hole) if inside and hole is not None else 0
        before = mask & ((1 << 8 * place) - 1)
        after = mask & ~before & ~(0xFF << 8 * place if inside else 0)
        chunks.append(
            Chunk(
                stop=stop,
                before=np.uint64(before),
                after=np.uint64(after),
                tens=np.uint64(10**n_later),
            )
        )
        n_later += n - inside
        stop -= n
    return tuple(chunks)
