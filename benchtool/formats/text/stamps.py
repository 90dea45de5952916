"""Calendar stamps and numbers too long for a float, as exact counts from the first."""

from __future__ import annotations

import re
import warnings
from collections.abc import Callable, Sequence

import numpy as np

from benchtool.formats.text.cells import is_number, plain
from benchtool.frozen import frozen_record
from benchtool.model.arrays import NDArray

IntArray = NDArray[np.int64]

NS = 1_000_000_000
_PLAIN = set("0123456789-:.T ")
MISSING = int(np.iinfo(np.int64).min)
_MONTH_NAMES = "jan feb mar apr may jun jul aug sep oct nov dec"
_STAMP = re.compile(
    r"(?P<date>\d{1,4}[-/.]\d{1,2}[-/.]\d{1,4})?[T ]?"
    r"(?:(?P<a>\d{1,4}):(?P<b>\d{2})(?::(?P<c>\d{2}))?(?:[.,](?P<f>\d+))?"
    r" ?(?P<half>[aApP][mM])?)?"
    r" ?(?P<zone>Z|UTC|[+-]\d{2}:?\d{2})?"
)


@frozen_record(eq=False)
class StampReader:
    """Reads calendar stamps as whole nanoseconds since 1970, or since midnight.

    Attributes:
        day_first: Whether ``02/03/2031`` is the second of March.
    """

    day_first: bool = True

    def counts(self, cells: Sequence[str]) -> IntArray:
        """Return nanoseconds, ``MISSING`` where a cell is no stamp."""
        try:
            return _iso(cells)
        except (ValueError, UserWarning):
            return np.array([self._count(cell) for cell in cells], np.int64)

    def _count(self, cell: str) -> int:
        match = _parts(cell)
        if match is None or not (match["date"] or match["a"]):
            return MISSING
        try:
            days = self._days(match["date"]) if match["date"] else 0
        except ValueError:
            return MISSING
        count = days * 86400 * NS + _of_day(match) - _zone(match["zone"]) * NS
        return count if abs(count) < -MISSING else MISSING

    def _days(self, text: str) -> int:
        from datetime import date

        parts = re.split(r"[-/.]", text)
        first, second, third = (int(part) for part in parts)
        if len(parts[0]) == 4:
            year, month, day = first, second, third
        else:
            day, month = (first, second) if self.day_first else (second, first)
            year = third if third > 99 else 2000 + third
        return date(year, month, day).toordinal() - date(1970, 1, 1).toordinal()


_BASIC = re.compile(r"(\d{4})(\d{2})(\d{2})[T _-]?(\d{2})(\d{2})(\d{2})(?!\d)")
_COLON_FRACTION = re.compile(r"(\d{1,2}:\d{2}:\d{2}):(\d{3}|\d{6})")
_NAMED_MONTH = re.compile(r"(\d{1,2})[- ]([A-Za-z]{3})[A-Za-z]*[- ](\d{4})")
_MONTHS = {name: i + 1 for i, name in enumerate(_MONTH_NAMES.split())}


def _parts(cell: str) -> re.Match[str] | None:
    """Return the parts of a stamp, ISO 8601 basic format among them."""
    text = _BASIC.sub(r"\1-\2-\3T\4:\5:\6", cell.strip().strip("[]"))
    text = _COLON_FRACTION.sub(r"\1.\2", text)
    return _STAMP.fullmatch(_NAMED_MONTH.sub(_numbered, text))


def _numbered(match: re.Match[str]) -> str:
    """Return ``02-Mar-2031`` as ``2031-3-02``."""
    return f"{match[3]}-{_MONTHS.get(match[2].lower(), 0)}-{match[1]}"


def _of_day(match: re.Match[str]) -> int:
    """Return nanoseconds since midnight; ``03:12.5`` is minutes and seconds."""
    if match["a"] is None:
        return 0
    a, b, c = int(match["a"]), int(match["b"]), match["c"]
    if c is None and match["f"] is not None:
        hours, minutes, seconds = 0, a, b
    else:
        hours, minutes, seconds = a, b, int(c or 0)
    if match["half"]:
        hours = hours % 12 + (12 if match["half"].lower() == "pm" else 0)
    fraction = int((match["f"] or "0")[:9].ljust(9, "0"))
    return (hours * 3600 + minutes * 60 + seconds) * NS + fraction


def _zone(text: str | None) -> int:
    if text is None or text in ("Z", "UTC"):
        return 0
    sign = -1 if text[0] == "-" else 1
    return sign * (int(text[1:3]) * 3600 + int(text[-2:]) * 60)


def _iso(cells: Sequence[str]) -> IntArray:
    """Read plain ISO 8601 stamps in bulk."""
    if any(
        len(cell) < 10 or cell[4:8:3] != "--" or cell[-1:] not in "0123456789" for cell in cells
    ):
        raise ValueError("not plain ISO 8601")
    if not set().union(*cells) <= _PLAIN or any(cell.count("-") != 2 for cell in cells):
        raise ValueError("not plain ISO 8601")
    with warnings.catch_warnings():
        warnings.simplefilter("error")  # a zone, which numpy would drop
        return np.array(cells, dtype="datetime64[ns]").astype(np.int64)


def stamp_decimals(cell: str) -> int:
    """Return the number of decimals of a stamp's seconds."""
    match = _parts(cell)
    return len(match["f"] or "") if match else 0


def has_date(cell: str) -> bool:
    """Say whether a stamp names its day."""
    match = _parts(cell)
    return bool(match and match["date"])


def has_zone(cell: str) -> bool:
    """Say whether a stamp names its time zone."""
    match = _parts(cell)
    return bool(match and match["zone"])


def is_day_first(cells: Sequence[str]) -> bool:
    """Say whether day comes before month: told by a number above 12, else by the dots."""
    for cell in cells:
        match = _parts(cell)
        parts = re.split(r"[-/.]", match["date"]) if match and match["date"] else []
        if len(parts) == 3 and len(parts[0]) < 4:
            if int(parts[0]) > 12:
                return True
            if int(parts[1]) > 12:
                return False
    return any("." in cell[:6] for cell in cells[:1])


def long_counts(cells: Sequence[str], decimal: str, exponent: int) -> IntArray:
    """Return fixed-point numbers as whole counts of ``10**exponent``, exactly."""
    return np.array([_long_count(cell, decimal, exponent) for cell in cells], np.int64)


def _long_count(cell: str, decimal: str, exponent: int) -> int:
    text = cell.strip().strip('"')
    if not text or not is_number(text, decimal):
        return MISSING
    from decimal import Decimal

    count = int(Decimal(plain(text, decimal)).scaleb(-exponent).to_integral_value())
    return count if abs(count) < -MISSING else MISSING


def relative(counts: IntArray, origin: int, per_unit: float) -> NDArray[np.float64]:
    """Return counts after ``origin`` in units of ``per_unit`` counts, NaN where missing."""
    result = (counts - origin) / per_unit
    result[counts == MISSING] = np.nan
    return result


Counter = Callable[[Sequence[str]], IntArray]
