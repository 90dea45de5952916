"""Preferred values of resistors and capacitors: E3 to E192.

References:
    IEC 60063:2015, tables 1 and 2. E24 and below are a table; from E48 up the values are
    10**(i/n) to three digits, with the one exception 9.20 in E192.
"""

from __future__ import annotations

import math
from bisect import bisect_left, bisect_right
from functools import lru_cache

SERIES = ("E3", "E6", "E12", "E24", "E48", "E96", "E192")

_E24 = (
    10,
    11,
    12,
    13,
    15,
    16,
    18,
    20,
    22,
    24,
    27,
    30,
    33,
    36,
    39,
    43,
    47,
    51,
    56,
    62,
    68,
    75,
    82,
    91,
)
_FORMULA_SAYS, _TABLE_SAYS = 919, 920
_CLOSE_REL = 1e-9  # arithmetic on the way here; neighbours of E192 are 1.2 % apart


def values(series: str) -> tuple[float, ...]:
    """Return the values of a series in one decade, from 1 up to below 10.

    Args:
        series: E3, E6, E12, E24, E48, E96 or E192.

    Raises:
        ValueError: If there is no such series.

    Example:
        >>> values("E6")
        (1.0, 1.5, 2.2, 3.3, 4.7, 6.8)
    """
    return tuple(hundreds / 100 for hundreds in _hundreds(series))


def nearest(value: float, series: str) -> float:
    """Return the value of a series that is nearest in ratio.

    Args:
        value: Above zero, in any unit.
        series: E3 to E192.

    Raises:
        ValueError: If ``value`` is not above zero, or there is no such series.

    Example:
        >>> nearest(318e3, "E24"), nearest(318e3, "E96")
        (330000.0, 316000.0)
    """
    below, above = neighbours(value, series)
    return below if value / below <= above / value else above


def neighbours(value: float, series: str) -> tuple[float, float]:
    """Return the values of a series next below and next above; a value of it twice.

    Args:
        value: Above zero, in any unit.
        series: E3 to E192.

    Raises:
        ValueError: If ``value`` is not above zero, or there is no such series.

    Example:
        >>> neighbours(318e3, "E12"), neighbours(330e3, "E12")
        ((270000.0, 330000.0), (330000.0, 330000.0))
    """
    around = _around(value, series)
    below = around[bisect_right(around, value * (1 + _CLOSE_REL)) - 1]
    above = around[bisect_left(around, value * (1 - _CLOSE_REL))]
    return below, above


def is_preferred(value: float, series: str | None = None) -> bool:
    """Return whether a value is in a series, or in any of them where none is named.

    Args:
        value: In any unit; nothing at or below zero is preferred.
        series: E3 to E192.

    Raises:
        ValueError: If there is no such series.
    """
    if not (value > 0 and math.isfinite(value)):
        return False
    if series is None:
        return series_of(value) is not None
    below, above = neighbours(value, series)
    return below == above


def series_of(value: float) -> str | None:
    """Return the first series, from E3 up, that holds a value; None where none does.

    Example:
        >>> series_of(330e3), series_of(316e3), series_of(4.6)
        ('E6', 'E48', None)
    """
    for series in SERIES:
        below, above = neighbours(value, series)
        if below == above:
            return series
    return None


def _around(value: float, series: str) -> tuple[float, ...]:
    """Return the values of a series in the decades around a value, rising."""
    if not (value > 0 and math.isfinite(value)):
        raise ValueError(f"a part's value is above zero and finite, got {value}")
    decade = math.floor(math.log10(value))
    return tuple(
        float(f"{hundreds}e{exponent - 2}")
        for exponent in (decade - 1, decade, decade + 1)
        for hundreds in _hundreds(series)
    )


@lru_cache
def _hundreds(series: str) -> tuple[int, ...]:
    if series not in SERIES:
        raise ValueError(f"no E-series {series!r}; there are {', '.join(SERIES)}")
    n = int(series[1:])
    if n <= 24:
        return tuple(10 * tens for tens in _E24[:: 24 // n])
    rounded = (round(100 * 10 ** (i / n)) for i in range(n))
    return tuple(_TABLE_SAYS if hundreds == _FORMULA_SAYS else hundreds for hundreds in rounded)
