"""Which columns give time, by the weight of name, unit and values; and what only looks like it.

A name that means time counts most, then a unit of time in the right place. Values alone tell
only where there is no name: a column that is named otherwise is no time because it rises.
"""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import numpy as np

from benchtool.formats.text import unitwords, words
from benchtool.formats.text.column import ClockColumn, ClockKind, Column
from benchtool.model.arrays import FloatArray, middle

_LEAST_SWEPT = 4  # rows that must all rise for a column to count as what a table is swept over
_SAME_SPAN = 0.05  # of two times of the same rows
_SAME_RATIO = 0.02  # how alike the ratios of a geometric sweep are


def named_clocks(columns: list[Column], *, stated: bool) -> list[ClockColumn]:
    """Return the columns whose name, unit or cells tell that they are time.

    Args:
        columns: The columns, from left to right.
        stated: Whether an interval or rate is known.
    """
    clocks = []
    for place, column in enumerate(columns):
        if column.kind == "S":
            clocks.append(ClockColumn(column=column, kind="stamp", evidence="calendar stamps"))
        elif is_named_time(column) and advances(column.head) and _may_stand(place, columns):
            kind: ClockKind = "index" if _is_count(column, stated=stated) else "number"
            clocks.append(ClockColumn(column=column, kind=kind, evidence=f"header {column.raw!r}"))
    return _with_dates(clocks)


def is_named_time(column: Column) -> bool:
    """Say whether name or unit of a column of numbers mean time."""
    if column.kind != "N" or column.date_only or words.is_length_name(column.name):
        return False
    named = words.is_time_name(column.name) and not unitwords.volt_factor(column.unit)
    return named or unitwords.time_unit(column.unit) is not None


def _may_stand(place: int, columns: list[Column]) -> bool:
    """Say whether a column may be time where it stands: one letter or a unit only may lead.

    In a table of results, ``R (kOhm), T (s)``, the last column has a unit of time too.
    """
    column = columns[place]
    if words.is_time_name(column.name) and not words.is_letter(column.name):
        return True
    return all(_may_precede(other) for other in columns[:place])


def _may_precede(column: Column) -> bool:
    """Say whether a column may stand left of a time that is named weakly."""
    if column.kind != "N" or is_named_time(column) or column.date_only:
        return True
    if column.head.size > 1 and np.ptp(column.head) == 0:
        return True  # the same in every row
    if unitwords.volt_factor(column.unit) is not None or words.is_index_name(column.name):
        return True
    return not column.name or (
        words.is_channel_name(column.name) and column.unit in ("", column.name)
    )


def _is_count(column: Column, *, stated: bool) -> bool:
    """Say whether a column named for time counts samples: ``Time (samples)``, ``X`` from 0 on."""
    if column.unit.lower() in unitwords.COUNT_UNITS and column.unit != "n":
        return True
    bare = words.is_bare_axis(column.name) and not column.unit
    return stated and bare and counts_by_one(column.head)


def advances(head: FloatArray) -> bool:
    """Say whether most steps of a column are forward, so that it can be time."""
    steps = np.diff(head[np.isfinite(head)])
    if steps.size == 0:
        return True
    n_back = np.count_nonzero(steps < 0)
    return bool(n_back <= max(1, 0.3 * steps.size) and np.any(steps > 0))


def counts_by_one(head: FloatArray) -> bool:
    """Say whether a column counts its rows; a lost row or a restart does not matter."""
    told = head[np.isfinite(head)]
    steps = np.diff(told)
    if steps.size == 0 or np.any(told != np.rint(told)):
        return False
    return bool(np.count_nonzero(steps == 1) >= 0.9 * steps.size)


def clocks_by_values(
    columns: list[Column], *, named: bool, stated: bool, unit_given: bool
) -> list[ClockColumn]:
    """Return the columns whose values tell time, where no name and no unit does.

    Args:
        columns: The columns, from left to right.
        named: Whether the file has a header.
        stated: Whether an interval or rate is known.
        unit_given: Whether the user names the unit of the time column.
    """
    clocks: list[ClockColumn] = []
    for place, column in enumerate(columns):
        if column.kind != "N" or not advances(column.head) or len(columns) == 1:
            continue
        if column.date_only:
            continue
        if _counts(column):
            if unit_given and not clocks:
                clocks.append(_by_values(column, "number"))
            elif stated and place == 0:
                return [_by_values(column, "index")]
            continue
        if column.name and not (unit_given and place == 0):
            continue
        if _rises(column.head) and not is_sweep(column.head) and (place == 0 or not named):
            clocks.append(_by_values(column, "number"))
    return _alike(clocks, columns)


def _counts(column: Column) -> bool:
    """Say whether a column is a running number, by name or by values."""
    if words.is_index_name(column.name) and column.unit.lower() in ("", *unitwords.COUNT_UNITS):
        return True
    other = words.is_other_axis(column.name) or words.is_length_name(column.name)
    channel = column.unit or words.is_channel_name(column.name)
    return counts_by_one(column.head) and not (column.name and (other or channel))


def _by_values(column: Column, kind: ClockKind) -> ClockColumn:
    what = "counts its rows" if kind == "index" else "rises from row to row"
    return ClockColumn(column=column, kind=kind, evidence=f"{column.title} {what}")


def _rises(head: FloatArray) -> bool:
    """Say whether a column rises in nearly every row; repeats and a restart are allowed."""
    steps = np.diff(head[np.isfinite(head)])
    n_back, n_on = int(np.count_nonzero(steps < 0)), int(np.count_nonzero(steps > 0))
    return steps.size >= 1 and n_on > 4 * n_back and n_back <= 0.1 * steps.size


def is_sweep(head: FloatArray) -> bool:
    """Say whether a column rises by a constant factor, as frequencies do and times do not."""
    told = head[np.isfinite(head)]
    if told.size < _LEAST_SWEPT + 1 or np.any(told <= 0):
        return False
    ratios = np.diff(np.log(told))
    typical = middle(ratios)
    even = typical > 0 and bool(np.all(np.abs(ratios - typical) <= _SAME_RATIO * typical))
    return even and told[-1] > 2 * told[0]


def swept_axis(columns: list[Column]) -> Column | None:
    """Return the column that a table is swept over, where that is something else than time.

    It is the first column of numbers, rises in every row and is named for what it is: a
    frequency, a part number, a month, a length of time.
    """
    numbers = [c for c in columns if c.kind == "N"]
    if len(numbers) < 2:
        return None
    first = numbers[0]
    told = first.head[np.isfinite(first.head)]
    if told.size < _LEAST_SWEPT or not np.all(np.diff(told) > 0):
        return None
    if first.date_only or is_sweep(first.head):
        return first
    if not first.name or _counts(first) or is_named_time(first):
        return None
    channel = unitwords.volt_factor(first.unit) is not None or words.is_channel_name(first.name)
    return None if channel and not words.is_other_axis(first.name) else first


def _alike(clocks: list[ClockColumn], columns: list[Column]) -> list[ClockColumn]:
    """Keep the first unnamed clock; more of them only where they alternate with channels."""
    if len(clocks) < 2:
        return clocks
    fields = {clock.column.field for clock in clocks}
    order = [c.field for c in columns]
    alternate = len(order) % 2 == 0 and fields >= set(order[::2]) and order[1] not in fields
    return [c for c in clocks if c.column.field in order[::2]] if alternate else clocks[:1]


def _with_dates(clocks: list[ClockColumn]) -> list[ClockColumn]:
    """Join a date with the time of day beside it; dates alone are no time of samples."""
    joined = list(clocks)
    for date in [c for c in clocks if c.column.date_only]:
        joined.remove(date)
        for i, clock in enumerate(joined):
            beside = abs(clock.column.field - date.column.field) == 1
            if clock.kind == "stamp" and not clock.column.date_only and beside:
                joined[i] = replace(clock, date=date.column.field)
                break
    return joined


def clock_of_each(
    clocks: list[ClockColumn], values: tuple[Column, ...]
) -> tuple[tuple[ClockColumn, ...], tuple[int | None, ...]]:
    """Give each channel the clock to its left, numbers before stamps where several adjoin."""
    if not clocks:
        return (), tuple(None for _ in values)
    chosen: list[ClockColumn] = []
    clock_of: list[int | None] = []
    for value in values:
        left = [c for c in clocks if c.column.field < value.field]
        clock = _preferred(left or clocks[:1], values)
        if clock not in chosen:
            chosen.append(clock)
        clock_of.append(chosen.index(clock))
    return tuple(chosen), tuple(clock_of)


def rival_clocks(clocks: list[ClockColumn]) -> tuple[tuple[Column, Column], ...]:
    """Return clocks that adjoin and run over different spans of time: whose are the channels?"""
    pairs = []
    for one, other in pairwise(clocks):
        a, b = _span_s(one), _span_s(other)
        beside = other.column.field == one.column.field + 1
        if beside and a is not None and b is not None and abs(a - b) > _SAME_SPAN * max(a, b):
            pairs.append((one.column, other.column))
    return tuple(pairs)


def _span_s(clock: ClockColumn) -> float | None:
    """Return the time from the first to the last of the first rows, None where no unit tells."""
    unit = unitwords.time_unit(clock.column.unit)
    told = clock.column.head[np.isfinite(clock.column.head)]
    if clock.kind != "number" or unit is None or told.size < 2:
        return None
    return unit.seconds(float(told[-1] - told[0]))


def _preferred(left: list[ClockColumn], values: tuple[Column, ...]) -> ClockColumn:
    """Of the clocks to the left take the last group without a channel between, best first."""
    between = {v.field for v in values}
    group = [left[-1]]
    for clock in reversed(left[:-1]):
        gap = range(clock.column.field + 1, group[-1].column.field)
        if any(f in between for f in gap):
            break
        group.append(clock)
    ranks = {"number": 0, "stamp": 1, "index": 2}
    return min(group, key=lambda c: (ranks[c.kind], not c.column.unit, c.column.field))
