"""Numbers in cells of any length, all at once: sign, decimal mark and exponent where they stand."""

from __future__ import annotations

import numpy as np

from benchtool.formats.text.digits import (
    ZEROS,
    Bytes,
    Words,
    all_digits,
    close_hole,
    find_byte,
    fold,
    place_of,
    scaled,
)
from benchtool.formats.text.rowform import KEEP, WORD, cut_chunks
from benchtool.model.arrays import BoolArray, FloatArray, IntArray

ROOM = 24
"""Bytes that must lie before the first cell; the longest number read in bulk."""

_MOST_BLANKS = 40
_FEW = 8  # cells to one with an exponent, for those to be looked up one by one
_BLANKS = (b" ", b"\t")
_BLANK, _PLUS, _MINUS = 32, ord("+"), ord("-")
_MARKS = {byte: np.uint64((byte[0] ^ ord("0")) * 0x0101010101010101) for byte in (b".", b",")}
_NONE = np.empty(0, np.int64)
_LOWER_BIT = np.uint8(0x20)
_LOWER = np.uint64(0x2020202020202020)
_E = np.uint64(ord("e") * 0x0101010101010101)
_TENS = np.array([10**n for n in range(19)], np.uint64)
_ONE = np.uint64(1)
_LAST = ROOM // WORD - 1
_MOST_ABOVE = np.uint64(1000)  # in the last word: 19 digits in all are below 2**64
_KEPT = [KEEP[np.clip(np.arange(ROOM + 1) - WORD * k, 0, WORD)] for k in range(_LAST + 1)]
"""For each word from the last, the mask of what is in a cell of each length."""


def parse_cells(
    text: bytes, starts: IntArray, stops: IntArray, decimal: bytes
) -> tuple[FloatArray, BoolArray | None]:
    """Return the numbers in cells, correctly rounded.

    Args:
        text: Bytes with ``ROOM`` of them before the first cell.
        starts: Where each cell begins, shape (n,).
        stops: One past where it ends.
        decimal: The decimal mark.

    Returns:
        Values, shape (n,), and which cells are to be read one by one; None where none is.
    """
    buffer = np.frombuffer(text, np.uint8)
    if any(blank in text for blank in _BLANKS):
        starts, stops = _trimmed(buffer, starts, stops)
    first = buffer[starts]
    negative = first == _MINUS
    starts = starts + (negative | (first == _PLUS))
    power: IntArray | None = None
    odd = np.zeros(starts.size, np.bool_)
    some = _with_exponent(text, starts, stops)
    if some.size:
        stops, power, odd = _without_exponent(text, starts, stops, some)
    lengths = stops - starts
    odd |= (lengths < 1) | (lengths > ROOM)
    mantissa, n_fraction, valid = _mantissa(text, stops, lengths, decimal)
    odd |= ~valid
    values, unsure = scaled(mantissa, -n_fraction if power is None else power - n_fraction)
    np.negative(values, out=values, where=negative)
    odd = odd if unsure is None else odd | unsure
    return values, odd if odd.any() else None


def _trimmed(buffer: Bytes, starts: IntArray, stops: IntArray) -> tuple[IntArray, IntArray]:
    """Take the blanks off both ends of the cells; never beyond the other end."""
    for _ in range(_MOST_BLANKS):
        blank = (buffer[stops - 1] <= _BLANK) & (stops > starts)
        if not blank.any():
            break
        stops = stops - blank
    for _ in range(_MOST_BLANKS):
        blank = (buffer[starts] <= _BLANK) & (stops > starts)
        if not blank.any():
            break
        starts = starts + blank
    return starts, stops


def _words(text: bytes, stops: IntArray, n: int) -> Words:
    """Return the ``n`` words that end at each stop, shape (cells, n), the last word last."""
    size = WORD * n
    windows = np.ndarray((len(text) - size + 1,), f"V{size}", text, 0, (1,))
    return windows[stops - size].view("<u8").reshape(-1, n)


def _mantissa(
    text: bytes, stops: IntArray, lengths: IntArray, decimal: bytes
) -> tuple[Words, IntArray | int, BoolArray]:
    """Return the digits as whole numbers, how many of them are fractions, and which are sound."""
    longest = min(int(lengths.max(initial=1)), ROOM)
    n_words = max(1, -(-longest // WORD))
    words = _words(text, stops, n_words)
    lengths = np.minimum(np.maximum(lengths, 0), ROOM)
    n_fraction = _common_fraction(text, stops, lengths, decimal)
    if n_fraction is None:
        return _any_mantissa(words, lengths, decimal)
    hole = n_fraction if n_fraction >= 0 else None
    mantissa, valid = _sum_of_words(words, lengths, None if hole is None else ROOM - 1 - hole)
    valid &= lengths > (hole is not None)
    return mantissa, max(n_fraction, 0), valid


def _sum_of_words(words: Words, lengths: IntArray, hole: int | None) -> tuple[Words, BoolArray]:
    """Return the whole numbers that words spell, ``hole`` being no digit, and which are sound."""
    n_words = words.shape[1]
    total, valid = np.zeros(lengths.size, np.uint64), np.ones(lengths.size, np.bool_)
    for chunk in cut_chunks(ROOM - WORD * n_words, ROOM, hole):
        k = (ROOM - chunk.stop) // WORD
        digits = words[:, n_words - 1 - k] ^ ZEROS
        digits &= _KEPT[k][lengths]
        part = digits & chunk.after
        if chunk.before:
            digits &= chunk.before
            digits <<= np.uint64(WORD)
            part |= digits
        valid &= all_digits(part)
        part = fold(part)
        if k == _LAST:
            valid &= part < _MOST_ABOVE
        if k:
            part *= chunk.tens
        total += part
    return total, valid


def _common_fraction(text: bytes, stops: IntArray, lengths: IntArray, decimal: bytes) -> int | None:
    """Return how many digits follow the mark in all cells, -1 without one; None if they differ."""
    cell = text[stops[0] - lengths[0] : stops[0]]
    if decimal not in cell:
        return -1 if decimal not in text else None
    n_fraction = len(cell) - 1 - cell.index(decimal)
    if n_fraction >= 2 * WORD:
        return None
    at = np.frombuffer(text, np.uint8)[stops - (n_fraction + 1)]
    return n_fraction if (at == decimal[0]).all() and (lengths > n_fraction).all() else None


def _any_mantissa(
    words: Words, lengths: IntArray, decimal: bytes
) -> tuple[Words, IntArray, BoolArray]:
    """Return what ``_mantissa`` does where the decimal mark has no place of its own."""
    mark, n_words = _MARKS[decimal], words.shape[1]
    total = np.zeros(lengths.size, np.uint64)
    n_fraction = np.zeros(lengths.size, np.int64)
    marks, n_later = np.zeros(lengths.size, np.int64), np.zeros(lengths.size, np.int64)
    valid = np.ones(lengths.size, np.bool_)
    for k in range(n_words):
        digits = words[:, n_words - 1 - k] ^ ZEROS
        digits &= _KEPT[k][lengths]
        hole = find_byte(digits, mark)
        marked = np.minimum(hole, _ONE).view(np.int64)
        if marked.any():
            valid &= (hole & (hole - _ONE)) == 0
            digits = close_hole(digits, hole)
            n_fraction += marked * (WORD * k + 7 - place_of(hole))
            marks += marked
        valid &= all_digits(digits)
        part = fold(digits)
        if k == _LAST:
            valid &= part < _MOST_ABOVE
        if k:
            part *= _TENS[n_later]
        total += part
        n_later += WORD - marked
    valid &= (marks <= 1) & (lengths > marks)
    return total, n_fraction, valid


def _with_exponent(text: bytes, starts: IntArray, stops: IntArray) -> IntArray:
    """Return which cells hold an E."""
    if b"e" not in text and b"E" not in text:
        return _NONE
    places = np.flatnonzero((np.frombuffer(text, np.uint8) | _LOWER_BIT) == ord("e"))
    if places.size > stops.size // _FEW:
        hole = find_byte(_words(text, stops, 1)[:, 0] | _LOWER, _E)
        return np.flatnonzero(hole & KEEP[np.minimum(stops - starts, WORD)])
    cells = np.searchsorted(stops, places, side="right")
    inside = cells < stops.size
    cells, places = cells[inside], places[inside]
    cells = cells[starts[cells] <= places]
    return cells if not cells.size else cells[np.append(True, cells[1:] != cells[:-1])]


def _without_exponent(
    text: bytes, starts: IntArray, stops: IntArray, some: IntArray
) -> tuple[IntArray, IntArray, BoolArray]:
    """Return where the mantissas end, the exponents, and which of those are none."""
    power = np.zeros(stops.size, np.int64)
    odd = np.zeros(stops.size, np.bool_)
    ends = stops[some]
    tail = _words(text, ends, 1)[:, 0]
    hole = find_byte(tail | _LOWER, _E) & KEEP[np.minimum(ends - starts[some], WORD)]
    after = np.maximum(7 - place_of(hole), 0)  # of a cell with more than one E it is no place
    sign = np.frombuffer(text, np.uint8)[ends - after]
    signed = (sign == _MINUS) | (sign == _PLUS)
    figures = after - signed
    digits = (tail ^ ZEROS) & KEEP[np.minimum(np.maximum(figures, 0), 4)]
    odd[some] = (figures < 1) | (figures > 4) | ((hole & (hole - _ONE)) != 0) | (hole == 0)
    odd[some] |= ~all_digits(digits)
    value = fold(digits).view(np.int64)
    power[some] = np.where(sign == _MINUS, -value, value)
    stops = stops.copy()
    stops[some] -= after + 1
    return stops, power, odd
