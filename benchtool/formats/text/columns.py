"""Which column is time, which are running numbers, and which hold the channels."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Literal

import numpy as np

from benchtool.formats.text import words
from benchtool.formats.text.cells import Kind, number
from benchtool.formats.text.heading import Heading
from benchtool.formats.text.layout import Layout
from benchtool.formats.text.metadata import Stated
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray

ClockKind = Literal["number", "stamp", "index"]


@frozen_record(eq=False)
class Column:
    """One field of the data rows.

    Attributes:
        field: Its index, from 0.
        name: Name, unit taken off; empty where the file gives none.
        unit: Unit as printed.
        raw: Header cell as printed.
        kind: What most of its cells are.
        head: Its first values, NaN where no number.
    """

    field: int
    name: str
    unit: str
    raw: str
    kind: Kind
    head: FloatArray

    @property
    def title(self) -> str:
        """The name, or ``column 2`` where there is none."""
        return self.name or f"column {self.field + 1}"


@frozen_record(eq=False)
class ClockColumn:
    """A column that gives time.

    Attributes:
        column: The column.
        kind: Numbers, calendar stamps, or a running number.
        date: Field of the date, where date and time of day stand apart.
        evidence: What it was recognised by.
    """

    column: Column
    kind: ClockKind
    evidence: str
    date: int | None = None


@frozen_record(eq=False)
class Columns:
    """Clocks and channels.

    Attributes:
        clocks: The clocks.
        values: The channels.
        clock_of: Each channel's clock, None where rows count.
        intervals: Sample intervals that stand in columns of their own.
        disordered: Columns named for time that do not go forward.
    """

    clocks: tuple[ClockColumn, ...]
    values: tuple[Column, ...]
    clock_of: tuple[int | None, ...]
    intervals: tuple[Stated, ...] = ()
    disordered: tuple[str, ...] = ()


def assign_columns(layout: Layout, heading: Heading, *, stated: bool, unit_given: bool) -> Columns:
    """Find the clocks and the channels.

    Args:
        layout: Layout of the rows.
        heading: Names and units.
        stated: Whether an interval or rate is known from metadata or options.
        unit_given: Whether the user names the unit of the time column.
    """
    columns = _columns(layout, heading)
    intervals, columns = _figures(columns, layout, heading)
    stated = stated or bool(intervals)
    columns = [c for c in columns if not _is_segment(c)]
    disordered = tuple(c.title for c in columns if _is_named_time(c) and not _advances(c.head))
    clocks = _named_clocks(columns)
    if not clocks and not disordered:
        clocks = _unnamed_clocks(
            columns, named=heading.is_named, stated=stated, unit_given=unit_given
        )
    clocks = _with_dates(clocks)
    taken = {f for clock in clocks for f in (clock.column.field, clock.date)}
    values = tuple(
        c
        for c in columns
        if c.field not in taken
        and c.kind in "NW"
        and c.title not in disordered
        and not _is_running(c, stated=stated or bool(clocks))
    )
    chosen, clock_of = _nearest(clocks, values)
    return Columns(
        clocks=chosen,
        values=values,
        clock_of=clock_of,
        intervals=intervals,
        disordered=disordered,
    )


def _columns(layout: Layout, heading: Heading) -> list[Column]:
    return [
        Column(
            field=i,
            name=heading.names[i],
            unit=heading.units[i],
            raw=heading.raw[i],
            kind=layout.kinds[i],
            head=np.array([number(row[i], layout.decimal) for row in layout.rows]),
        )
        for i in layout.fields
    ]


def _figures(
    columns: list[Column], layout: Layout, heading: Heading
) -> tuple[tuple[Stated, ...], list[Column]]:
    """Take columns that hold one figure: ``Increment`` and ``Start`` beside the data."""
    intervals: list[Stated] = []
    figures: set[int] = set()
    kept = {c.field: c for c in columns}
    for i, name in enumerate(heading.names):
        is_interval = words.is_interval_key(name)
        if not (is_interval or words.is_start_key(name)):
            continue
        cells = [row[i] for row in (*heading.cells, *layout.rows) if i < len(row)]
        told = {
            v for v in (number(cell, layout.decimal) for cell in cells if cell) if not math.isnan(v)
        }
        if len(told) != 1 or (i in kept and kept[i].head.size < 2):
            continue
        figures.add(i)
        value = told.pop()
        if is_interval and value > 0:
            intervals.append(_stated(value, name, heading.units[i]))
    return tuple(intervals), [c for c in columns if c.field not in figures]


def _stated(value: float, name: str, unit: str) -> Stated:
    known = words.time_unit(unit)
    seconds = known.seconds(value) if known else value
    return Stated(value=seconds, evidence=f"column {name!r}", assumed_unit=known is None)


def _is_segment(column: Column) -> bool:
    return words.is_segment_name(column.name) and not words.is_time_name(column.name)


def _is_running(column: Column, *, stated: bool) -> bool:
    """Say whether a column only counts its rows."""
    if words.is_index_name(column.name):
        return True
    unnamed = not column.name and column.field == 0
    return unnamed and stated and _counts_by_one(column.head)


def _counts_by_one(head: FloatArray) -> bool:
    steps = np.diff(head)
    return bool(steps.size >= 1 and np.all(steps == 1) and head[0] == np.rint(head[0]))


def _named_clocks(columns: list[Column]) -> list[ClockColumn]:
    clocks = []
    for column in columns:
        if column.kind == "S":
            clocks.append(ClockColumn(column=column, kind="stamp", evidence="calendar stamps"))
        elif _is_named_time(column) and _advances(column.head):
            kind: ClockKind = "index" if _is_count(column) else "number"
            clocks.append(ClockColumn(column=column, kind=kind, evidence=f"header {column.raw!r}"))
    return clocks


def _is_named_time(column: Column) -> bool:
    if column.kind != "N":
        return False
    named = words.is_time_name(column.name) and not words.volt_factor(column.unit)
    return named or words.time_unit(column.unit) is not None


def _is_count(column: Column) -> bool:
    return column.unit.lower() in words.COUNT_UNITS and column.unit != "n"


def _advances(head: FloatArray) -> bool:
    """Say whether most steps of a column are forward, so that it can be time."""
    steps = np.diff(head[np.isfinite(head)])
    if steps.size == 0:
        return True
    n_back = np.count_nonzero(steps < 0)
    return bool(n_back <= max(1, 0.3 * steps.size) and np.any(steps > 0))


def _unnamed_clocks(
    columns: list[Column], *, named: bool, stated: bool, unit_given: bool
) -> list[ClockColumn]:
    """Find time by its values, where no name and no unit tells."""
    clocks: list[ClockColumn] = []
    for place, column in enumerate(columns):
        if column.kind != "N" or not _advances(column.head) or len(columns) == 1:
            continue
        if words.is_index_name(column.name) or (not column.name and _counts_by_one(column.head)):
            if unit_given and not clocks:
                clocks.append(_by_values(column, "number"))
            elif stated and place == 0:
                return [_by_values(column, "index")]
            continue
        if column.name and (place > 0 or words.is_channel_name(column.name)):
            continue
        if _rises_strictly(column.head) and (place == 0 or not named):
            clocks.append(_by_values(column, "number"))
    return _alike(clocks, columns)


def _by_values(column: Column, kind: ClockKind) -> ClockColumn:
    what = "counts its rows" if kind == "index" else "rises from row to row"
    return ClockColumn(column=column, kind=kind, evidence=f"{column.title} {what}")


def _rises_strictly(head: FloatArray) -> bool:
    """Say whether a column rises in nearly every row; repeats and a restart are allowed."""
    steps = np.diff(head[np.isfinite(head)])
    n_back = int(np.count_nonzero(steps < 0))
    return bool(steps.size >= 1 and np.any(steps > 0) and n_back <= max(0.1 * steps.size, 0))


def _alike(clocks: list[ClockColumn], columns: list[Column]) -> list[ClockColumn]:
    """Keep the first unnamed clock; more of them only where they alternate with channels."""
    if len(clocks) < 2:
        return clocks
    fields = {clock.column.field for clock in clocks}
    order = [c.field for c in columns]
    alternate = len(order) % 2 == 0 and fields >= set(order[::2]) and order[1] not in fields
    return [c for c in clocks if c.column.field in order[::2]] if alternate else clocks[:1]


def _with_dates(clocks: list[ClockColumn]) -> list[ClockColumn]:
    """Join a date column with the time of day beside it."""
    if len(clocks) < 2 or clocks[0].kind != "stamp":
        return clocks
    first, second = clocks[0], clocks[1]
    adjoining = second.column.field == first.column.field + 1
    if second.kind == "stamp" and adjoining:
        return [replace(second, date=first.column.field), *clocks[2:]]
    return clocks


def _nearest(
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
