"""Which columns are clocks, which are running numbers, and which hold the channels."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator
from dataclasses import replace

import numpy as np

from benchtool.formats.text import unitwords, words
from benchtool.formats.text.cells import Kind, number
from benchtool.formats.text.clocks import (
    advances,
    clock_of_each,
    clocks_by_values,
    counts_by_one,
    is_named_time,
    named_clocks,
    rival_clocks,
    swept_axis,
)
from benchtool.formats.text.column import ClockColumn, Column, Columns, told_apart
from benchtool.formats.text.heading import Heading
from benchtool.formats.text.layout import Layout
from benchtool.formats.text.metadata import Stated
from benchtool.formats.text.wordcells import is_bit_row, n_bits, names_bits

_MOST_CHANNELS = 32  # that the rows of one file are told apart by
_DAYS = (19000101, 21001231)
_LONGEST_DATE = 10


def assign_columns(layout: Layout, heading: Heading, *, stated: bool, unit_given: bool) -> Columns:
    """Find the clocks and the channels.

    Args:
        layout: Layout of the rows.
        heading: Names and units.
        stated: Whether an interval or rate is known from metadata or options.
        unit_given: Whether the user names the unit of the time column.
    """
    intervals, columns = _figures(columns_of(layout, heading), layout, heading)
    stated = stated or bool(intervals)
    key = next((c for c in columns if _is_key(c, layout)), None)
    columns = [c for c in columns if c is not key and c.kind != "L" and not _is_segment(c)]
    disordered = tuple(c for c in columns if is_named_time(c) and not advances(c.head))
    clocks = named_clocks(columns, stated=stated)
    if not clocks and not disordered:
        named = heading.is_named
        clocks = clocks_by_values(columns, named=named, stated=stated, unit_given=unit_given)
    lengths = tuple(c for c in columns if _is_length(c))
    rest = _channels(columns, clocks, {c.field for c in (*disordered, *lengths)})
    rest = _without_running(rest, stated=stated or bool(clocks))
    values = told_apart(bit for c in rest for bit in _bits(c, layout))
    listed = _as_list(columns, clocks, values, lengths)
    if listed is not None:
        return replace(listed, intervals=intervals)
    found = _as_samples(columns, clocks, values)
    titles = tuple(c.title for c in disordered)
    return replace(found, intervals=intervals, key=key, disordered=titles)


def _as_list(
    columns: list[Column],
    clocks: list[ClockColumn],
    values: tuple[Column, ...],
    lengths: tuple[Column, ...],
) -> Columns | None:
    if clocks and values:
        return None
    from benchtool.formats.text.listcolumns import listed_columns

    return listed_columns(columns, clocks, values, lengths)


def _as_samples(
    columns: list[Column], clocks: list[ClockColumn], values: tuple[Column, ...]
) -> Columns:
    chosen, clock_of = clock_of_each(clocks, values)
    return Columns(
        clocks=chosen,
        values=values,
        clock_of=clock_of,
        axis=None if clocks else swept_axis(columns),
        dates=tuple(c for c in columns if c.date_only),
        rivals=rival_clocks(clocks),
    )


def columns_of(layout: Layout, heading: Heading) -> list[Column]:
    """Return the fields that hold data, with their names."""
    return [
        Column(
            field=i,
            name=heading.names[i],
            unit=heading.units[i],
            raw=heading.raw[i],
            kind=_kind_of([row[i] for row in layout.rows], layout.kinds[i]),
            head=np.array([number(row[i], layout.decimal) for row in layout.rows]),
            date_only=_is_date_only([row[i] for row in layout.rows], layout.kinds[i]),
        )
        for i, kind in enumerate(layout.kinds)
        if kind in "NSWHL"
    ]


def _kind_of(cells: list[str], kind: Kind) -> Kind:
    """Return the kind of a column as a whole: ``0101`` and ``0010`` are bits and no numbers."""
    return "H" if kind == "N" and is_bit_row(cells) else kind


def _is_date_only(cells: list[str], kind: str) -> bool:
    """Say whether cells are days: ``2031-03-02``, or ``20310302`` as a number."""
    told = [cell for cell in cells if cell]
    if kind == "S":
        return not any(":" in cell or "T" in cell or len(cell) > _LONGEST_DATE for cell in told)
    return kind == "N" and bool(told) and all(_is_day(cell) for cell in told)


def _is_day(cell: str) -> bool:
    if not (len(cell) == 8 and cell.isdigit() and _DAYS[0] <= int(cell) <= _DAYS[1]):
        return False
    return 1 <= int(cell[4:6]) <= 12 and 1 <= int(cell[6:]) <= 31


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
    known = unitwords.time_unit(unit)
    seconds = known.seconds(value) if known else value
    return Stated(value=seconds, evidence=f"column {name!r}", assumed_unit=known is None)


def _is_segment(column: Column) -> bool:
    return words.is_segment_name(column.name) and not words.is_time_name(column.name)


def _channels(
    columns: list[Column], clocks: list[ClockColumn], others: set[int]
) -> Iterator[Column]:
    """Yield the columns that may be channels."""
    taken = {f for clock in clocks for f in (clock.column.field, clock.date)}
    for column in columns:
        passed = column.field in taken or column.field in others or column.date_only
        if column.kind in "NWH" and not passed:
            yield column


def _bits(column: Column, layout: Layout) -> Iterator[Column]:
    """Yield a channel, or one for each bit of the words it holds."""
    if column.kind != "H":
        yield column
        return
    if names_bits(column.name):
        cells = [row[column.field] for row in layout.rows]
        for bit in range(n_bits(cells)):
            yield replace(column, bit=bit)


def _is_key(column: Column, layout: Layout) -> bool:
    """Say whether a column tells which channel a row is of."""
    if not words.is_channel_key(column.name) or column.kind not in "NL" or column.unit:
        return False
    names = {row[column.field] for row in layout.rows}
    few = len(names) <= min(_MOST_CHANNELS, len(layout.rows) / 2)
    return few and (column.kind == "L" or all(name.isdigit() for name in names))


def _is_length(column: Column) -> bool:
    """Say whether a column holds lengths of time."""
    named = words.is_length_name(column.name) or words.is_interval_key(column.name)
    return column.kind == "N" and named and unitwords.time_unit(column.unit) is not None


def _without_running(columns: Iterable[Column], *, stated: bool) -> Iterator[Column]:
    """Leave out columns that only count their rows."""
    for column in columns:
        if not _is_running(column, stated=stated):
            yield column


def _is_running(column: Column, *, stated: bool) -> bool:
    """Say whether a column only counts its rows."""
    if words.is_index_name(column.name) and column.unit.lower() in ("", *unitwords.COUNT_UNITS):
        return True
    if not stated or not counts_by_one(column.head):
        return False
    if not column.name:
        return column.field == 0
    return not column.unit and not words.is_channel_name(column.name)
