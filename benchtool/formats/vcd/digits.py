"""Whole numbers in a block, eight digits at a time."""

from __future__ import annotations

import numpy as np

from benchtool.model.arrays import IntArray, NDArray

Eights = NDArray[np.uint64]

_MOST_DIGITS = 18  # any number of so many digits is below 2**63
_FEW_MORE = 3  # digits beyond eight that are sooner taken one by one
ZEROS = np.uint64(0x3030303030303030)
_TO_TEN = np.uint64(0x7676767676767676)
_TOPS = np.uint64(0x8080808080808080)
_ALL = 2**64 - 1


def words_at(buffer: NDArray[np.uint8], starts: IntArray) -> Eights:
    """Return the eight bytes from each start on, the first in the lowest place."""
    windows: NDArray[np.void] = np.ndarray(
        (buffer.size - 7,), np.dtype("V8"), buffer=buffer.data, strides=(1,)
    )
    return windows[starts].view("<u8")


def counts_of(buffer: NDArray[np.uint8], starts: IntArray, stops: IntArray) -> IntArray | None:
    """Return the whole numbers from ``starts`` to ``stops``; None where one is none.

    Args:
        buffer: Bytes with 24 of room before the first number.
        starts: Where the digits of each begin.
        stops: One past where they end.
    """
    lengths = stops - starts
    if lengths.size == 0:
        return np.empty(0, np.int64)
    longest = int(lengths.max())
    if lengths.min() < 1 or longest > _MOST_DIGITS:
        return None
    shortest = int(lengths.min())
    total = np.zeros(lengths.size, np.int64)
    for done in range(0, longest, 8):
        if 8 <= done <= shortest == longest <= done + _FEW_MORE:
            return _with_more(total, buffer, stops, range(done, longest))
        eights = words_at(buffer, stops - 8 - done) ^ ZEROS
        if shortest < done + 8:
            eights &= digit_mask(shortest if shortest == longest else lengths, done)
        # a byte above 9 reaches its top bit when 118 is added, one above 127 has it set before
        if np.bitwise_or.reduce((eights + _TO_TEN) | eights) & _TOPS:
            return None
        total += _value(eights).view(np.int64) * 10**done
    return total


def digit_mask(lengths: IntArray | int, done: int) -> Eights | np.uint64:
    """Return the mask of the bytes that are digits, the last ones of each eight."""
    if isinstance(lengths, int):
        return np.uint64(_ALL << 8 * (8 - min(lengths - done, 8)) & _ALL)
    spare = np.clip(8 + done - lengths, 0, 8).astype(np.uint64) * np.uint64(8)
    shifted = np.uint64(_ALL) << np.minimum(spare, np.uint64(63))
    return np.where(spare < 64, shifted, np.uint64(0))


def _with_more(
    total: IntArray, buffer: NDArray[np.uint8], stops: IntArray, places: range
) -> IntArray | None:
    """Add the digits at these places, counted from the last, to the numbers so far."""
    for place in places:
        digits = buffer[stops - 1 - place] - np.uint8(48)
        if digits.max() > 9:
            return None
        total += digits * np.int64(10**place)
    return total


def _value(eights: Eights) -> Eights:
    """Return the number that eight bytes from 0 to 9 make, the first in the lowest byte.

    Neighbours are joined: digits to pairs, pairs to fours, fours to eights.
    """
    pairs = eights * np.uint64(10 * 2**8 + 1) >> np.uint64(8)
    fours = (pairs & np.uint64(0x00FF00FF00FF00FF)) * np.uint64(100 * 2**16 + 1) >> np.uint64(16)
    return (fours & np.uint64(0x0000FFFF0000FFFF)) * np.uint64(10000 * 2**32 + 1) >> np.uint64(32)
