"""The form of a row whose digits are all that changes: where its numbers stand in it."""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from benchtool.formats.text.digits import Bytes
from benchtool.frozen import frozen_record

WORD = 8
KEEP = np.array([((1 << 8 * n) - 1) << 8 * (WORD - n) for n in range(WORD + 1)], np.uint64)
"""Masks that keep the last n bytes of a word."""

STRIP = 128
"""Rows of a model."""

_ZERO = ord("0")
_MOST_DIGITS = 19  # any number of so many digits is below 2**64


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
        places: The bytes of its digits, from the first.
        hole: The byte of the decimal mark among them.
        n_fraction: How many of them come after the mark.
        exponent: The bytes of the digits of its exponent.
        divides: Whether the exponent has a minus sign.
    """

    negative: bool
    places: tuple[int, ...]
    hole: int | None
    n_fraction: int
    exponent: tuple[int, ...] = ()
    divides: bool = False


@frozen_record(eq=False)
class Model:
    """What rows are held against: the bytes of ``STRIP`` rows with zeros for their digits.

    Attributes:
        bytes: These rows.
        most: What may be left of one row less the model, byte by byte.
        numbers: The numbers wanted of it.
    """

    bytes: Bytes
    most: Bytes
    numbers: tuple[Number, ...]


@lru_cache(maxsize=128)
def read_model(shape: bytes, form: RowForm) -> Model | None:
    """Read a row whose digits are all 0; None if it is no row of the form."""
    spans = _spans(shape, form.mark)
    if len(spans) != form.n_fields:
        return None
    numbers = [_number(shape, *spans[field], form.decimal) for field in form.fields]
    if any(number is None for number in numbers):
        return None
    row = np.frombuffer(shape, np.uint8)
    return Model(
        bytes=np.tile(row, STRIP),
        most=np.where(row == _ZERO, 9, 0).astype(np.uint8),
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
    end = at + len(text)
    return Number(
        negative=negative,
        places=tuple(i for i in range(begins, begins + len(mantissa)) if i != hole),
        hole=hole,
        n_fraction=len(fraction),
        exponent=tuple(range(end - len(figures), end)) if e else (),
        divides=exponent.startswith(b"-"),
    )


@lru_cache(maxsize=1024)
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
