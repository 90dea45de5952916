"""Fields of whole blocks of lines as numbers: digits are decoded where they stand."""

from __future__ import annotations

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, NDArray
from benchtool_drivers.streams.rows import MOST_DIGITS, ByteArray, IntArray

LF, CR, ZERO, STAR = 10, 13, 48, 42

_HEX = np.full(256, 255, np.uint8)
_HEX[np.frombuffer(b"0123456789ABCDEF", np.uint8)] = np.arange(16)


@frozen_record(eq=False)
class Fields:
    """Where the fields of the lines of a block stand.

    Attributes:
        lines: Which lines have the right number of fields, shape (n,).
        starts: First byte of each field, shape (n, fields).
        ends: One past the last byte of each, shape (n, fields).
    """

    lines: IntArray
    starts: IntArray
    ends: IntArray


def find_fields(block: ByteArray, line_ends: IntArray, n_fields: int, delimiter: int) -> Fields:
    """Return the fields of the lines that have ``n_fields`` of them.

    Args:
        block: Whole lines.
        line_ends: Where each LF stands.
        n_fields: Fields of a line.
        delimiter: The byte between them.
    """
    marks = np.flatnonzero((block == delimiter) | (block == LF))
    n = line_ends.size
    if marks.size == n * n_fields and bool((marks[n_fields - 1 :: n_fields] == line_ends).all()):
        lines, ends = np.arange(n), marks.reshape(n, n_fields)
    else:
        last = np.searchsorted(marks, line_ends)
        lines = np.flatnonzero(np.diff(last, prepend=-1) == n_fields)
        ends = marks[last[lines, None] + np.arange(1 - n_fields, 1)]
    starts = np.empty_like(ends)
    starts[:, 1:] = ends[:, :-1] + 1
    starts[:, 0] = np.append(0, line_ends[:-1] + 1)[lines]
    ends = ends.copy()
    tail = ends[:, -1]
    tail -= (tail > starts[:, -1]) & (block[tail - 1] == CR)
    return Fields(lines=lines, starts=starts, ends=ends)


def decode_whole(block: ByteArray, starts: IntArray, ends: IntArray) -> tuple[IntArray, BoolArray]:
    """Return the whole numbers in fields, and which fields are nothing but digits."""
    width = ends - starts
    good = (width >= 1) & (width <= MOST_DIGITS)
    values = np.zeros(starts.size, np.int64)
    if not starts.size:
        return values, good
    least = int(width.min())
    for place in range(min(int(width.max()), MOST_DIGITS)):
        digit = block[ends - (place + 1)] - np.uint8(ZERO)  # a byte below "0" wraps and is above 9
        if place >= least:
            digit[place >= width] = 0
        good &= digit <= 9
        values += digit.astype(np.int64) * 10**place
    return values, good


def decode_decimal(
    block: ByteArray, starts: IntArray, ends: IntArray, mark: int
) -> tuple[IntArray, BoolArray, int]:
    """Return numbers times 10 to the number of their decimals, which are good, and that number.

    Fields of another number of decimals than the first are not good here.
    """
    marks = np.flatnonzero(block == mark)
    if not (marks.size and starts.size):
        return (*decode_whole(block, starts, ends), 0)
    nearest = marks[np.minimum(np.searchsorted(marks, starts), marks.size - 1)]
    has = (nearest >= starts) & (nearest < ends)
    decimals = np.where(has, ends - nearest - 1, 0)
    n = int(decimals[0])
    whole, good = decode_whole(block, starts, np.where(has, nearest, ends))
    good &= (decimals == n) & (has == (n > 0))
    if n:
        part, fine = decode_whole(block, np.where(has, nearest + 1, starts), ends)
        good &= fine & (ends - starts <= MOST_DIGITS)
        whole = whole * 10**n + part
    return whole, good, n


def decode_bytes(
    block: ByteArray, starts: IntArray, ends: IntArray, table: NDArray[np.int8]
) -> tuple[NDArray[np.int8], BoolArray]:
    """Return the codes of fields of one byte, and which are known."""
    codes = table[block[np.minimum(starts, block.size - 1)]]
    return codes, (ends - starts == 1) & (codes >= 0)


def check_sums(block: ByteArray, starts: IntArray, ends: IntArray) -> tuple[IntArray, BoolArray]:
    """Return where the text before the check sum of each line ends, and which sums are right.

    Args:
        block: Whole lines.
        starts: First byte of each line.
        ends: One past its last byte.
    """
    stars = ends - 3
    good = stars > starts
    stars = np.where(good, stars, starts + 1)
    if not starts.size:
        return stars, good
    bounds = np.column_stack([starts, stars]).ravel()
    sums = np.bitwise_xor.reduceat(block, np.minimum(bounds, block.size - 1))[::2]
    high = _HEX[block[np.minimum(stars + 1, block.size - 1)]]
    low = _HEX[block[np.minimum(stars + 2, block.size - 1)]]
    good &= (block[np.minimum(stars, block.size - 1)] == STAR) & (high < 16) & (low < 16)
    good &= sums == (high << 4 | low & 15)
    return stars, good
