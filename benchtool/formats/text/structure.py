"""All that the head and the tail of a delimited text tell of its structure."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import field

import numpy as np

from benchtool.formats.content import Content
from benchtool.formats.text.cells import plain
from benchtool.formats.text.clockcells import ClockCells, clock_cells
from benchtool.formats.text.column import ClockColumn, Columns
from benchtool.formats.text.columns import assign_columns
from benchtool.formats.text.decoding import Decoder, Wanted
from benchtool.formats.text.encoding import Encoding, find_encoding, narrowed
from benchtool.formats.text.ending import find_cut, last_lines
from benchtool.formats.text.heading import Heading, read_heading
from benchtool.formats.text.layout import Layout, is_comment
from benchtool.formats.text.lineends import first_lines, line_offset, with_newlines
from benchtool.formats.text.metadata import Metadata, Stated, read_metadata
from benchtool.formats.text.readings import find_layout
from benchtool.formats.text.refusals import (
    no_time,
    refuse_bare_axis,
    refuse_lost_fractions,
    refuse_tables,
    refuse_thinned,
    refuse_wrapped,
)
from benchtool.formats.text.states import converter
from benchtool.formats.text.timeunit import FoundUnit, find_time_unit, stated_interval
from benchtool.formats.text.unitwords import TimeUnit
from benchtool.formats.text.walking import DataRows
from benchtool.formats.text.widths import without_wide
from benchtool.formats.zeros import without_zeros, zeros_notice
from benchtool.frozen import frozen_record
from benchtool.model.capture import ReadOptions
from benchtool.model.quantity import Notice

_SIDE_LINES = 200
_TAIL_ROWS = 64
_EPOCH_S = (1e9, 4e9)  # 2001-09-09 to 2096-10-02


@frozen_record(eq=False)
class Structure:
    """What was found before the first walk over the rows.

    Attributes:
        rows: The data rows and their decoder: clocks first, then channels.
        encoding: Encoding of the file.
        layout: Delimiter, decimal mark, fields.
        heading: Names and units.
        metadata: What the lines around the data say.
        columns: Clocks and channels.
        cells: How each clock column is decoded.
        units: Unit of each clock column, and its evidence.
        stated: Sample interval that the user or the file states.
        warnings: What was assumed.
        above: The lines above the first row.
    """

    rows: DataRows
    encoding: Encoding
    layout: Layout = field(repr=False)
    heading: Heading
    metadata: Metadata
    columns: Columns
    cells: tuple[ClockCells, ...]
    units: tuple[FoundUnit, ...]
    stated: Stated | None
    warnings: tuple[Notice, ...]
    above: tuple[str, ...] = field(default=(), repr=False)


@frozen_record(eq=False)
class _Text:
    """The file as text: its first and last lines."""

    content: Content
    encoding: Encoding
    codec: str
    n_mark: int
    n_zeros: int
    lines: list[str]
    last: list[str]


def find_structure(content: Content, options: ReadOptions) -> Structure:
    """Find the structure of a delimited text.

    Raises:
        AmbiguousStructureError: If two readings are sound, or none gives time.
        MalformedCaptureError: If there are no rows of numbers.
    """
    text = _open_text(content, options.skip)
    layout = find_layout(text.lines, options, content.source)
    heading = read_heading(text.lines, layout)
    metadata = read_metadata(_around(text.lines, layout, heading), layout)
    columns = _columns(layout, heading, metadata, options, content.source)
    statements = (*metadata.intervals, *columns.intervals)
    stated = stated_interval(statements, options, needed=columns.counted)
    if columns.counted and stated is None:
        raise no_time(content.source, columns, layout, heading)
    if columns.counted:
        refuse_thinned(metadata, options, content.source)
        refuse_wrapped(columns, content.source)
    cells = tuple(_cells_of(clock, layout, text) for clock in columns.clocks)
    units = tuple(
        _unit_of(clock, metadata, options, stated, content.source) for clock in columns.clocks
    )
    stop, cut = find_cut(text.content, layout, text.last)
    return Structure(
        rows=_data_rows(text, layout, columns, cells, stop),
        encoding=text.encoding,
        layout=layout,
        heading=heading,
        metadata=metadata,
        columns=columns,
        cells=cells,
        units=units,
        stated=stated,
        warnings=(*cut, *zeros_notice(text.n_zeros), *_assumptions(units, stated, columns)),
        above=tuple(text.lines[: layout.start]),
    )


def _columns(
    layout: Layout, heading: Heading, metadata: Metadata, options: ReadOptions, source: str
) -> Columns:
    """Return clocks and channels, as the user overrules them; refuse what is no capture."""
    known = bool(metadata.intervals) or options.interval_s is not None
    unit_given = options.time_unit is not None
    columns = assign_columns(layout, heading, stated=known, unit_given=unit_given)
    if options.time is not None or unit_given:
        from benchtool.formats.text.overruled import overrule_time, refuse_idle_unit

        columns = overrule_time(columns, layout, heading, options, source)
        refuse_idle_unit(columns, options, source)
    refuse_tables(columns, layout, heading, options, source)
    refuse_lost_fractions(layout, heading, source)
    return columns


def _open_text(content: Content, skip: int | None) -> _Text:
    encoding = find_encoding(content.head())
    narrow, n_zeros = without_zeros(narrowed(content, encoding))
    head = first_lines(narrow)
    codec = "utf-8" if encoding.is_wide else encoding.name
    codec = "utf-8" if codec == "ascii" else codec
    n_mark = 0 if encoding.is_wide else encoding.n_mark
    text = with_newlines(head[n_mark:]).decode(codec, errors="replace").rstrip("\0")
    lines = text.split("\n")
    if narrow.size > len(head) or not lines[-1]:
        lines.pop()  # a line that goes on beyond the head, or the nothing after the last
    if skip:
        from benchtool.formats.text.overruled import passed_over

        lines = passed_over(lines, skip, content.source)
    return _Text(
        content=narrow,
        encoding=encoding,
        codec=codec,
        n_mark=n_mark,
        n_zeros=n_zeros,
        lines=without_wide(lines, content.source),
        last=last_lines(narrow, codec),
    )


def _around(lines: list[str], layout: Layout, heading: Heading) -> list[str]:
    """Return the lines around the data: before them, comments among them, cells beside them."""
    kept = set() if layout.n_fields == 1 else set(heading.rows)
    before = [line for i, line in enumerate(lines[: layout.start]) if i not in kept]
    among, side = [], []
    beside = [i for i, kind in enumerate(layout.kinds) if kind not in "NSW"]
    for line in lines[layout.start : layout.start + _SIDE_LINES]:
        if is_comment(line):
            among.append(line)
        elif beside and len(cells := layout.split(line)) == layout.n_fields:
            side.append((layout.delimiter or ",").join(cells[i] for i in beside))
    return [*before, *among, *side]


def _cells_of(clock: ClockColumn, layout: Layout, text: _Text) -> ClockCells:
    """Look at a clock's cells in the first and the last rows."""
    cells = [_joined(row, clock) for row in layout.rows]
    for line in text.last[1:-1][-_TAIL_ROWS:]:
        row = layout.split(line)
        if len(row) == layout.n_fields:
            cells.append(_joined(row, clock))
    return clock_cells(clock, cells, layout.decimal)


def _joined(row: Sequence[str], clock: ClockColumn) -> str:
    cell = row[clock.column.field]
    return cell if clock.date is None else f"{row[clock.date]} {cell}"


def _unit_of(
    clock: ClockColumn, metadata: Metadata, options: ReadOptions, stated: Stated | None, source: str
) -> FoundUnit:
    if clock.kind == "index" and stated is not None:
        unit = TimeUnit(name="samples", times=stated.value)
        return FoundUnit(unit=unit, evidence=f"{clock.evidence}; interval from {stated.evidence}")
    found = find_time_unit(clock, metadata, options, stated.value if stated else None)
    if found.warnings and found.is_assumed:
        refuse_bare_axis(clock.column, source)
    return found


def _assumptions(
    units: tuple[FoundUnit, ...], stated: Stated | None, columns: Columns
) -> tuple[Notice, ...]:
    notices = [notice for found in units[:1] for notice in found.warnings]
    if columns.counted and stated is not None and stated.assumed_unit:
        notices.append(
            Notice(
                code="assumed-time-unit",
                text=f"the sample interval is stated without a unit ({stated.evidence}): "
                f"{stated.value:.6g} s are assumed (--interval)",
            )
        )
    return tuple(notices)


def _data_rows(
    text: _Text,
    layout: Layout,
    columns: Columns,
    cells: tuple[ClockCells, ...],
    stop: int,
) -> DataRows:
    wanted = [
        *(c.wanted for c in cells),
        *(Wanted(field=c.field, convert=converter(c)) for c in columns.values),
        *([Wanted(field=columns.key.field, convert=converter(columns.key))] if columns.key else []),
    ]
    decoder = Decoder(
        layout=layout,
        wanted=tuple(wanted),
        codec=text.codec,
        n_clocks=len(cells),
        may_be_short=len(columns.clocks) > 1,
    )
    return DataRows(
        content=text.content,
        decoder=decoder,
        start=_offset(text, layout.start),
        stop=stop,
        first_line=layout.start + 1,
    )


def _offset(text: _Text, line: int) -> int:
    """Return the byte offset of a line of the head."""
    return text.n_mark + line_offset(first_lines(text.content)[text.n_mark :], line)


def epoch_ns(structure: Structure) -> int | None:
    """Return the first stamp in nanoseconds since 1970, where the time column is absolute."""
    if not structure.cells:
        return None
    if structure.cells[0].start_ns is not None:
        return structure.cells[0].start_ns
    clock, unit = structure.columns.clocks[0], structure.units[0].unit
    told = np.flatnonzero(np.isfinite(clock.column.head))
    if clock.kind != "number" or not told.size:
        return None
    if not _EPOCH_S[0] <= unit.seconds(float(clock.column.head[told[0]])) < _EPOCH_S[1]:
        return None
    from decimal import Decimal

    cell = structure.layout.rows[int(told[0])][clock.column.field]
    seconds = Decimal(plain(cell, structure.layout.decimal)) / Decimal(int(unit.over))
    return int(seconds * Decimal(int(unit.times)) * 1_000_000_000)
