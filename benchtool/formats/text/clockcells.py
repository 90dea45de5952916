"""How the cells of a clock column become numbers, and what their last digit is."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from benchtool.formats.text.cells import last_digit, number, significant_digits
from benchtool.formats.text.column import ClockColumn
from benchtool.formats.text.decoding import Convert, Wanted
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, middle

_FLOAT_DIGITS = 15  # more are not exact in a float
_FINE = 1e-5  # of a step: how well a float must place a stamp
_DAY_S = 86400.0
_FEW_LEADING = 4  # cells of the leading decade that may all have lost their zeros
_MOST_PLACES = 300  # a float has no finer digits


@frozen_record(eq=False)
class ClockCells:
    """How to decode a clock column.

    Attributes:
        wanted: The column for the decoder.
        resolution: Last printed digit, in the column's unit.
        relative: Whether decoded stamps count from the first one, not from the file's zero.
        start_ns: First stamp in nanoseconds since 1970, where it is a date with its zone.
    """

    wanted: Wanted
    resolution: float
    relative: bool
    start_ns: int | None = None


def clock_cells(clock: ClockColumn, cells: Sequence[str], decimal: str) -> ClockCells:
    """Say how a clock column is to be decoded.

    Args:
        clock: The column.
        cells: Its cells in the first and last rows of the file.
        decimal: Decimal mark.
    """
    field = clock.column.field
    if clock.kind == "stamp":
        return _stamp_cells(clock, cells)
    resolution = printed_resolution(cells, decimal)
    if max((significant_digits(c, decimal) for c in cells if c), default=0) <= _FLOAT_DIGITS:
        return ClockCells(wanted=Wanted(field=field), resolution=resolution, relative=False)
    convert = _long_converter(cells, decimal, clock.column.head)
    if convert is None:
        return ClockCells(wanted=Wanted(field=field), resolution=resolution, relative=False)
    return ClockCells(
        wanted=Wanted(field=field, convert=convert), resolution=resolution, relative=True
    )


def _long_converter(cells: Sequence[str], decimal: str, head: FloatArray) -> Convert | None:
    """Return a converter for stamps that a float holds too coarsely; None where floats do."""
    from benchtool.formats.text.stamps import MISSING, long_counts, relative

    digits = [d for d in (last_digit(c, decimal) for c in cells) if d is not None]
    exponent = min(digits)
    values = [abs(number(c, decimal)) for c in cells]
    largest = max(v for v in values if not math.isnan(v))
    steps = np.diff(head[np.isfinite(head)])
    step = middle(steps[steps > 0]) if np.any(steps > 0) else 0.0
    if math.ulp(largest) < _FINE * step or largest * 10.0**-exponent >= 2.0**63:
        return None
    origin = next(int(c) for c in long_counts(cells, decimal, exponent) if c != MISSING)

    def convert(column: Sequence[str]) -> FloatArray:
        counts = long_counts(column, decimal, exponent)
        if exponent <= 0:
            return relative(counts, origin, 10.0**-exponent)
        return relative(counts, origin, 1.0) * 10.0**exponent

    return convert


def _stamp_cells(clock: ClockColumn, cells: Sequence[str]) -> ClockCells:
    from benchtool.formats.text import stamps
    from benchtool.formats.text.stamps import MISSING, NS, StampReader, relative

    reader = StampReader(day_first=stamps.is_day_first(cells))
    counts = reader.counts(cells)
    origin = next((int(c) for c in counts if c != MISSING), 0)
    dated = any(stamps.has_date(cell) for cell in cells[:1])
    decimals = max((stamps.stamp_decimals(cell) for cell in cells), default=0)

    def convert(column: Sequence[str]) -> FloatArray:
        seconds = relative(reader.counts(column), origin, NS)
        if not dated:
            seconds[seconds < -_DAY_S / 24] += _DAY_S  # past midnight
        return seconds

    zoned = dated and any(stamps.has_zone(cell) for cell in cells[:1])
    return ClockCells(
        wanted=Wanted(field=clock.column.field, convert=convert, second=clock.date),
        resolution=10.0**-decimals,
        relative=True,
        start_ns=origin if zoned else None,
    )


def printed_resolution(cells: Sequence[str], decimal: str) -> float:
    """Return the last printed digit of the largest numbers of a column.

    The largest are told by the leading decade: numbers printed with so many significant digits
    have coarser last digits there, and zeros cut off at the end hide digits in some cells only.
    """
    told = [(abs(number(c, decimal)), last_digit(c, decimal)) for c in cells]
    known = [(value, digit) for value, digit in told if digit is not None]
    if not known:
        return 0.0
    largest = max(value for value, _ in known)
    decade = 10.0 ** math.floor(math.log10(largest)) if largest > 0 else 0.0
    leading = [digit for value, digit in known if value >= decade]
    if len(leading) < _FEW_LEADING:
        leading = [digit for value, digit in known if value >= largest / 10]
    step = min(leading)
    step = max(-_MOST_PLACES, min(_MOST_PLACES, step))
    return 10.0**step if step > 0 else 1 / 10.0**-step
