"""Decimal numbers from digits, by whole-array arithmetic, bit for bit as ``float``.

Eight digits are folded at a time inside one 64-bit word: pairs, then fours, then all eight. A
decimal number is a whole mantissa and a power of ten. Where the mantissa is below 2**53 and the
power within 10**22 both are exact in binary, so that one multiplication or division rounds once
and correctly (W. D. Clinger, "How to read floating point numbers accurately", PLDI 1990). A
longer mantissa is divided in two parts, with the remainder of the first quotient taken exactly
(T. J. Dekker, "A floating-point technique for extending the available precision", 1971).
"""

from __future__ import annotations

import numpy as np

from benchtool.model.arrays import BoolArray, FloatArray, NDArray

Bytes = NDArray[np.uint8]
Words = NDArray[np.uint64]

EXACT_POWER = 22
"""10**22 is the last power of ten that is exact in a float."""

SHORT = 15
"""Any whole number of so many digits is exact in a float."""

_TENS: FloatArray = np.array([float(10**n) for n in range(EXACT_POWER + 1)])
_EXACT = np.uint64(1 << 53)
_SPLIT = 134217729.0  # 2**27 + 1
_NEAR = 2.0**-72  # a millionth of the last place: so near to half of it two parts do not tell


def _each(byte: int) -> np.uint64:
    """Return a word of eight equal bytes."""
    return np.uint64(byte * 0x0101010101010101)


ZEROS = _each(ord("0"))
_SEVENS, _TOPS, _SIX = _each(0x7F), _each(0x80), _each(0x76)
_PAIRS = np.uint64(0x00FF00FF00FF00FF)
_FOURS = np.uint64(0x0000FFFF0000FFFF)
_BY_10, _BY_100 = np.uint64(1 + (10 << 8)), np.uint64(1 + (100 << 16))
_BY_10000 = np.uint64(1 + (10000 << 32))
_PLACES = np.uint64(0x0001020304050607)
_ONE = np.uint64(1)
_BITS_7, _BITS_8, _BITS_16, _BITS_32, _BITS_56 = (np.uint64(n) for n in (7, 8, 16, 32, 56))


def fold(digits: Words) -> Words:
    """Return the numbers that words of eight digit values spell, the first in the lowest byte.

    Args:
        digits: Values 0 to 9 a byte, shape (n,); overwritten.
    """
    digits *= _BY_10
    digits >>= _BITS_8
    digits &= _PAIRS
    digits *= _BY_100
    digits >>= _BITS_16
    digits &= _FOURS
    digits *= _BY_10000
    digits >>= _BITS_32
    return digits


def find_byte(words: Words, byte: np.uint64) -> Words:
    """Return words with a 1 in the lowest bit of each byte that equals ``byte``."""
    away = words ^ byte
    low = away & _SEVENS
    low += _SEVENS
    low |= away
    low |= _SEVENS
    np.invert(low, out=low)
    low >>= _BITS_7
    return low


def place_of(single: Words) -> NDArray[np.int64]:
    """Return which byte of each word holds its only 1, from 0."""
    return ((single * _PLACES) >> _BITS_56).view(np.int64)


def close_hole(digits: Words, hole: Words) -> Words:
    """Move the bytes before a hole up by one, over it; words without a hole stay.

    Args:
        digits: Words of digit values.
        hole: A 1 in the lowest bit of the byte that is no digit, 0 where there is none.
    """
    before = hole - np.minimum(hole, _ONE)
    moved = digits & before
    moved <<= _BITS_8
    before |= hole * np.uint64(0xFF)
    np.invert(before, out=before)
    before &= digits
    before |= moved
    return before


def all_digits(values: Words) -> BoolArray:
    """Say which words hold nothing but 0 to 9 in their bytes."""
    above = values + _SIX
    above |= values
    above &= _TOPS
    sound: BoolArray = above == 0
    return sound


def scaled(mantissa: Words, power: NDArray[np.int64] | int) -> tuple[FloatArray, BoolArray | None]:
    """Return ``mantissa`` times ten to ``power``, correctly rounded.

    Args:
        mantissa: Whole numbers, shape (n,).
        power: Powers of ten, one for each or one for all.

    Returns:
        The values, and where they are not sure to be correct; None where all are.
    """
    whole = mantissa.astype(np.float64)
    long = mantissa >= _EXACT
    if not isinstance(power, int) and power.size and (power == power[0]).all():
        power = int(power[0])
    if isinstance(power, int):
        if abs(power) > EXACT_POWER:
            return whole, np.ones(whole.size, np.bool_)
        values = whole / _TENS[-power] if power <= 0 else whole * _TENS[power]
        unsure = None
    else:
        size = np.abs(power)
        beyond = size > EXACT_POWER
        unsure = beyond if beyond.any() else None
        tens = _TENS[np.minimum(size, EXACT_POWER)]
        values = whole / tens if (power <= 0).all() else _times(whole, tens, power)
    if not long.any():
        return values, unsure
    where = np.flatnonzero(long)
    powers = np.broadcast_to(np.asarray(power), whole.shape)[where]
    values[where], doubtful = _divided(mantissa[where], powers)
    unsure = np.zeros(whole.size, np.bool_) if unsure is None else unsure
    unsure[where] |= doubtful
    return values, unsure


def scale_short(mantissa: Words, power: int, out: FloatArray) -> None:
    """Do what ``scaled`` does with mantissas of at most ``SHORT`` digits, in place.

    Args:
        mantissa: Whole numbers, shape (n,).
        power: Power of ten of all, at most ``EXACT_POWER`` in size.
        out: Takes the values.
    """
    np.copyto(out, mantissa.view(np.int64))
    if power < 0:
        np.divide(out, _TENS[-power], out=out)
    else:
        np.multiply(out, _TENS[power], out=out)


def _times(whole: FloatArray, tens: FloatArray, power: NDArray[np.int64]) -> FloatArray:
    values: FloatArray = np.where(power < 0, whole / tens, whole * tens)
    return values


def _divided(mantissa: Words, power: NDArray[np.int64]) -> tuple[FloatArray, BoolArray]:
    """Divide whole numbers beyond 2**53 by powers of ten; say where the rounding is in doubt."""
    tens = _TENS[np.clip(-power, 0, EXACT_POWER)]
    high = mantissa.astype(np.float64)
    low = (mantissa - high.astype(np.uint64)).view(np.int64).astype(np.float64)
    first = high / tens
    product, rest = _product(first, tens)
    second = ((high - product) - rest + low) / tens
    values = first + second
    slack = values * _NEAR
    near_tie = (first + (second + slack)) != (first + (second - slack))
    return values, (power > 0) | near_tie


def _product(a: FloatArray, b: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return a product and what its rounding left out, exactly."""
    product = a * b
    (a_high, a_low), (b_high, b_low) = _halves(a), _halves(b)
    rest = a_low * b_low - (((product - a_high * b_high) - a_low * b_high) - a_high * b_low)
    return product, rest


def _halves(a: FloatArray) -> tuple[FloatArray, FloatArray]:
    shifted = _SPLIT * a
    high = shifted - (shifted - a)
    return high, a - high
