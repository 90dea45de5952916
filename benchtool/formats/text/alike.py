"""Rows of one width that differ in nothing but their digits: numbers straight from the bytes.

One row is read by the rules; all others are held against it, byte for byte, by whole-array
arithmetic. What is left of a row less the model is its digits, and those of a field are folded
from words of eight bytes at places that are the same in all rows.
"""

from __future__ import annotations

import numpy as np

from benchtool.formats.text.digits import (
    EXACT_POWER,
    SHORT,
    Bytes,
    Words,
    fold,
    scale_short,
    scaled,
)
from benchtool.formats.text.rowform import (
    STRIP,
    WORD,
    Chunk,
    Model,
    Number,
    RowForm,
    cut_chunks,
    read_model,
)
from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, FloatArray

_ZERO = ord("0")
_NEAR = 20_000  # rows decoded at a time: few enough to stay in the cache
_DIGITS = bytes(range(_ZERO, _ZERO + 10))
_BYTE = np.uint64(8)
_SHAPE = bytes.maketrans(_DIGITS, b"0" * 10)


@frozen_record(eq=False)
class Digits:
    """Rows less the model, with eight bytes of room before them; their extremes at each byte."""

    bytes: Bytes
    n_rows: int
    width: int
    low: list[int]
    high: list[int]


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
    return parse_rows(np.frombuffer(text, np.uint8).reshape(n_rows, width), form)


def parse_rows(
    rows: Bytes, form: RowForm, limits: tuple[Bytes, Bytes] | None = None
) -> tuple[FloatArray, BoolArray | None] | None:
    """Do what ``parse_alike`` does with rows of bytes, shape (rows, width).

    Args:
        rows: The rows.
        form: The form of a row.
        limits: The extremes of all bytes, where they are known.
    """
    n_rows, width = rows.shape
    model = read_model(rows[0].tobytes().translate(_SHAPE), form)
    if model is None:
        return None
    table = np.empty((n_rows, len(model.numbers)), order="F")
    n_near = -(-n_rows // -(-n_rows // _NEAR))
    room = np.empty(WORD + n_near * width, np.uint8)
    unsure: BoolArray | None = None
    for first in range(0, n_rows, n_near):
        last = min(first + n_near, n_rows)
        digits = _less_model(rows[first:last], model, room, limits)
        if digits is None:
            return None
        doubt = _fill(table[first:last], digits, model.numbers)
        if doubt is not None:
            unsure = np.zeros(table.shape, np.bool_) if unsure is None else unsure
            unsure[first:last] = doubt
    return table, unsure


def _less_model(
    rows: Bytes, model: Model, room: Bytes, limits: tuple[Bytes, Bytes] | None
) -> Digits | None:
    """Return the digits of rows; None if a row departs from the model."""
    n_rows, width = rows.shape
    digits = room[: WORD + rows.size]
    whole = n_rows // STRIP * STRIP
    for start, stop, n in ((0, whole, STRIP), (whole, n_rows, 1)):
        if start < stop:
            np.subtract(
                rows[start:stop].reshape(-1, n * width),
                model.bytes[: n * width],
                out=digits[WORD + start * width : WORD + stop * width].reshape(-1, n * width),
            )
    if limits is None:
        low, high = extremes(digits[WORD:].reshape(n_rows, width))
    else:
        low, high = (limit - model.bytes[:width] for limit in limits)
    if (np.maximum(low, high) > model.most).any():
        return None
    return Digits(bytes=digits, n_rows=n_rows, width=width, low=low.tolist(), high=high.tolist())


def extremes(rows: Bytes) -> tuple[Bytes, Bytes]:
    """Return the least and the largest value of each byte of rows, shape (rows, width)."""
    n_rows, width = rows.shape
    whole = n_rows // STRIP * STRIP
    parts = [rows[whole:]]
    if whole:  # in long strips: a reduction goes along the last axis fast
        strips = rows[:whole].reshape(-1, STRIP * width)
        parts += [f.reduce(strips, axis=0).reshape(STRIP, width) for f in (np.minimum, np.maximum)]
    some = np.concatenate(parts)
    return some.min(axis=0), some.max(axis=0)


@frozen_record
class Spelt:
    """How a whole number is made of folded words, and of digits that are the same in all rows.

    Attributes:
        chunks: The words, the last first: what lies between the digits that change.
        times: Power of ten of the last digit of them.
        constant: Value of the other digits.
    """

    chunks: tuple[Chunk, ...]
    times: int
    constant: int


def _fill(table: FloatArray, digits: Digits, numbers: tuple[Number, ...]) -> BoolArray | None:
    """Fill in the numbers of rows; return which are not sure to be rounded correctly, if any."""
    spelt = [
        _spelt(digits, places, hole)
        for number in numbers
        for places, hole in ((number.places, number.hole), (number.exponent, None))
    ]
    wholes = _fold_all(digits, spelt)
    unsure: BoolArray | None = None
    for k, number in enumerate(numbers):
        doubt = _scale(table[:, k], number, *wholes[2 * k : 2 * k + 2])
        if doubt is not None and doubt.any():
            unsure = np.zeros(table.shape, np.bool_) if unsure is None else unsure
            unsure[:, k] = doubt
    return unsure


def _scale(
    column: FloatArray, number: Number, mantissa: Words | int, exponent: Words | int
) -> BoolArray | None:
    """Fill in one number of the rows; return which are not sure to be rounded correctly."""
    power = exponent if isinstance(exponent, int) else exponent.view(np.int64)
    power = (-power if number.divides else power) - number.n_fraction
    if isinstance(mantissa, int):
        mantissa = np.full(column.size, mantissa, np.uint64)
    doubt: BoolArray | None = None
    if isinstance(power, int) and len(number.places) <= SHORT and abs(power) <= EXACT_POWER:
        scale_short(mantissa, power, column)
    else:
        column[:], doubt = scaled(mantissa, power)
    if number.negative:
        np.negative(column, out=column)
    return doubt


def _spelt(digits: Digits, places: tuple[int, ...], hole: int | None) -> Spelt:
    """Say how to read the whole number that digits at these places spell."""
    low, high = digits.low, digits.high
    active = [i for i, at in enumerate(places) if low[at] != high[at]]
    first, last = (active[0], active[-1]) if active else (0, -1)
    constant = 0
    for i, at in enumerate(places):
        constant = 10 * constant + (0 if first <= i <= last else low[at])
    chunks = cut_chunks(places[first], places[last] + 1, hole) if active else ()
    return Spelt(chunks=chunks, times=10 ** (len(places) - 1 - last), constant=constant)


def _fold_all(digits: Digits, spelt: list[Spelt]) -> list[Words | int]:
    """Return whole numbers, one a row, or one for all where no digit changes."""
    chunks = [chunk for one in spelt for chunk in one.chunks]
    folded = np.empty((len(chunks), digits.n_rows), np.uint64)
    shape, step = (digits.n_rows,), (digits.width,)
    for i, chunk in enumerate(chunks):
        words = np.ndarray(shape, "<u8", digits.bytes.data, chunk.stop, step)
        np.bitwise_and(words, chunk.after, out=folded[i])
        if chunk.before:
            moved = words & chunk.before
            moved <<= _BYTE
            folded[i] |= moved
    fold(folded.reshape(-1))
    parts = iter(folded)
    return [_joined(one, [next(parts) for _ in one.chunks]) for one in spelt]


def _joined(spelt: Spelt, parts: list[Words]) -> Words | int:
    """Put the folded words of a number together."""
    if not parts:
        return spelt.constant
    whole = parts[0]
    for chunk, part in zip(spelt.chunks[1:], parts[1:], strict=True):
        np.multiply(part, chunk.tens, out=part)
        whole += part
    if spelt.times > 1:
        whole *= np.uint64(spelt.times)
    if spelt.constant:
        whole += np.uint64(spelt.constant)
    return whole
