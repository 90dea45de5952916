"""The unit of a time column: never guessed silently."""

from __future__ import annotations

import re
from collections.abc import Sequence

import numpy as np

from benchtool.errors import AmbiguousStructureError
from benchtool.formats.text import unitwords, words
from benchtool.formats.text.column import ClockColumn, Column
from benchtool.formats.text.metadata import Metadata, Stated
from benchtool.formats.text.unitwords import SECOND, TIME_UNITS, TimeUnit
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.capture import ReadOptions
from benchtool.model.quantity import Notice

_EPOCHS = ((1e9, "s"), (1e12, "ms"), (1e15, "us"), (1e18, "ns"))  # 2001-09-09 to 2096-10-02
_EPOCH_SPAN = 4.0
_FACTOR = r"[x×*·] ?1[0e]|10\^"
_SERIAL_DAYS = (36526.0, 73051.0)  # 2000-01-01 to 2100-01-01


@frozen_record(eq=False)
class FoundUnit:
    """A unit of time and what it was found from."""

    unit: TimeUnit
    evidence: str
    warnings: tuple[Notice, ...] = ()

    @property
    def is_assumed(self) -> bool:
        """Whether nothing in the file tells the unit."""
        return any(notice.code == "assumed-time-unit" for notice in self.warnings)


def find_time_unit(
    clock: ClockColumn, metadata: Metadata, options: ReadOptions, stated_s: float | None
) -> FoundUnit:
    """Return the unit of a time column.

    Raises:
        AmbiguousStructureError: If the file names a unit that is none of time, or none for a column
            of whole numbers (``no-time-unit``).
    """
    if clock.kind == "stamp":
        return FoundUnit(unit=SECOND, evidence="calendar stamps")
    if options.time_unit is not None:
        return FoundUnit(unit=named_unit(options.time_unit), evidence="--time-unit")
    column = clock.column
    named = _by_header(column, metadata)
    if named is not None:
        return named
    if metadata.time_unit is not None:
        return FoundUnit(unit=metadata.time_unit[0], evidence=metadata.time_unit[1])
    return (
        _by_interval(column.head, stated_s)
        or _by_epoch(column.head)
        or _by_serial_day(column)
        or _assumed(clock)
    )


def _by_header(column: Column, metadata: Metadata) -> FoundUnit | None:
    """Return the unit that a column's header names; None where it names none.

    Raises:
        AmbiguousStructureError: If it names one that is none of time, or a factor beside it.
    """
    if column.kind == "N" and re.search(_FACTOR, column.raw):
        raise AmbiguousStructureError(
            f"the header {column.raw!r} gives a factor beside the unit of time",
            hint="Name the unit that the numbers are in with --time-unit s, ms, us or ns.",
        )
    unit = unitwords.time_unit(column.unit) if column.unit else _in_name(column.name)
    if unit is not None:
        notices = _contradicted(unit, metadata, column.raw)
        return FoundUnit(unit=unit, evidence=f"header {column.raw!r}", warnings=notices)
    if column.unit:
        raise AmbiguousStructureError(
            f"the time column {column.raw!r} has a unit that is none of time: {column.unit!r}",
            hint="Name the unit with --time-unit s, ms, us or ns.",
        )
    return None


def _contradicted(unit: TimeUnit, metadata: Metadata, raw: str) -> tuple[Notice, ...]:
    """Say so where the lines around the data give another unit than the header."""
    if metadata.time_unit is None or metadata.time_unit[0] == unit:
        return ()
    other, evidence = metadata.time_unit
    notice = Notice(
        code="time-unit-differs",
        text=f"the header {raw!r} gives the time in {unit.name}, the {evidence} in {other.name}; "
        "the header was taken (--time-unit)",
    )
    return (notice,)


def named_unit(name: str) -> TimeUnit:
    """Return the unit that the user names.

    Raises:
        AmbiguousStructureError: If there is none of that name.
    """
    unit = unitwords.time_unit(name)
    if unit is None:
        raise AmbiguousStructureError(
            f"{name!r} is no unit of time", hint="Use --time-unit s, ms, us, ns, ps or fs."
        )
    return unit


def _in_name(name: str) -> TimeUnit | None:
    parts = [part.removeprefix("time") for part in words.normal(name).split()]
    known = [TIME_UNITS[p] for p in parts if p in TIME_UNITS and (len(p) > 1 or len(parts) == 1)]
    return known[-1] if known else None


def _by_interval(head: FloatArray, stated_s: float | None) -> FoundUnit | None:
    """Find the unit in which the steps of the column are the stated interval."""
    steps = np.diff(head[np.isfinite(head)])
    if stated_s is None or not steps.size or not (step := float(np.mean(steps))) > 0:
        return None
    for name in ("s", "ms", "us", "ns", "ps"):
        unit = TIME_UNITS[name]
        if abs(unit.seconds(step) / stated_s - 1) < 0.01:
            evidence = f"in {name} the steps are the stated interval {stated_s:.6g} s"
            return FoundUnit(unit=unit, evidence=evidence)
    return None


def _by_epoch(head: FloatArray) -> FoundUnit | None:
    told = head[np.isfinite(head)]
    for least, name in _EPOCHS:
        if told.size and least <= told[0] < _EPOCH_SPAN * least:
            evidence = f"{told[0]:.0f} {name} since 1970 is a date of this century"
            return FoundUnit(unit=TIME_UNITS[name], evidence=evidence)
    return None


def _by_serial_day(column: Column) -> FoundUnit | None:
    """Find days since 1900, as spreadsheets keep dates, under a name that says date."""
    told = column.head[np.isfinite(column.head)]
    dated = {"date", "datum", "datetime"} & set(words.normal(column.name).split())
    if not dated or not told.size or not _SERIAL_DAYS[0] <= told[0] < _SERIAL_DAYS[1]:
        return None
    evidence = f"{told[0]:.9g} days since 1900, as spreadsheets keep a date"
    return FoundUnit(unit=TIME_UNITS["days"], evidence=evidence)


def _assumed(clock: ClockColumn) -> FoundUnit:
    """Assume seconds, which fractions are printed in; whole numbers may count anything.

    Raises:
        AmbiguousStructureError: If the column holds whole numbers alone (``no-time-unit``).
    """
    told = clock.column.head[np.isfinite(clock.column.head)]
    if np.array_equal(told, np.floor(told)) and not words.is_bare_axis(clock.column.name):
        raise AmbiguousStructureError(
            f"the time column ({clock.column.title}) holds whole numbers and no unit: they may be "
            "seconds, milliseconds, microseconds or ticks",
            hint="Name the unit with --time-unit s, ms, us or ns; if they only count the rows, "
            "give --time none and --interval.",
            code="no-time-unit",
        )
    notice = Notice(
        code="assumed-time-unit",
        text=f"the file gives no unit for its time column ({clock.column.title}): seconds are "
        "assumed; another unit scales every time (--time-unit)",
    )
    return FoundUnit(unit=SECOND, evidence="no unit in the file", warnings=(notice,))


def stated_interval(
    statements: Sequence[Stated], options: ReadOptions, *, needed: bool
) -> Stated | None:
    """Return the sample interval that the user or the file states.

    Args:
        statements: What the file states.
        options: What the user states.
        needed: Whether there is no time column to decide between two statements.

    Raises:
        AmbiguousStructureError: If the file states two that differ and one is needed.
    """
    if options.interval_s is not None:
        return Stated(value=options.interval_s, evidence="--interval or --rate")
    if not statements:
        return None
    values = [stated.value for stated in statements]
    if max(values) <= 1.01 * min(values):
        return min(statements, key=lambda stated: stated.assumed_unit)
    if not needed:
        return None
    raise AmbiguousStructureError(
        f"the file states two sample intervals: {min(values):.6g} s and {max(values):.6g} s",
        hint="Say which with --interval.",
    )
