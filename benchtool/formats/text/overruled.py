"""The time column that the user names, and options that a text has no use for."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

from benchtool.errors import UsageError
from benchtool.formats.overrules import OPTIONS, idle_option
from benchtool.formats.text import unitwords
from benchtool.formats.text.column import ClockColumn, ClockKind, Column, Columns, told_apart
from benchtool.formats.text.columns import columns_of
from benchtool.formats.text.heading import Heading
from benchtool.formats.text.layout import Layout
from benchtool.model.capture import ReadOptions

_UNUSUAL = ":/&~^_!"
"""Delimiters that are not tried unless the user names them."""

_LEAST_ROWS = 3

SoundLayouts = Callable[[list[str], ReadOptions], list[tuple[int, Layout]]]

NONE = "none"
"""The name of no column: rows are counted."""


def passed_over(lines: list[str], skip: int, source: str) -> list[str]:
    """Return lines of which the first ``skip`` are blank, so that the others keep their numbers.

    Raises:
        UsageError: If none would be left (``option-idle``).
    """
    if skip >= len(lines):
        raise idle_option(
            "skip",
            source,
            f"only {len(lines)} lines lie in its head",
            "Give the number of lines before the header or the data.",
        )
    return [*([""] * skip), *lines[skip:]]


def overrule_time(
    found: Columns, layout: Layout, heading: Heading, options: ReadOptions, source: str
) -> Columns:
    """Return the columns with the time column that the user names.

    What was found to be time is no channel then, unless nothing else is.

    Args:
        found: As detected.
        layout: Layout of the rows.
        heading: Names and units.
        options: ``time`` is a name, a number from 1, or ``none``.
        source: File name, for errors.

    Raises:
        UsageError: If there is no such column, or it holds no times (``no-such-column``).
    """
    if options.time is None:
        return found
    if options.time.casefold() == NONE:
        clocks: tuple[ClockColumn, ...] = ()
        taken: set[int | None] = set()
    else:
        clock = _chosen(found, layout, heading, options, source)
        clocks, taken = (clock,), {clock.column.field, clock.date}
    values = tuple(value for value in found.values if value.field not in taken)
    if not values:
        values = told_apart(
            c.column for c in found.clocks if c.column.field not in taken and c.kind != "stamp"
        )
    return Columns(
        clocks=clocks,
        values=values,
        clock_of=tuple(0 if clocks else None for _ in values),
        intervals=found.intervals,
    )


def _chosen(
    found: Columns, layout: Layout, heading: Heading, options: ReadOptions, source: str
) -> ClockColumn:
    column = _named(str(options.time), layout, heading, source)
    known = next((c for c in found.clocks if column.field in (c.column.field, c.date)), None)
    if known is not None and known.kind == "stamp":
        return known
    counts = column.unit.lower() in unitwords.COUNT_UNITS and column.unit != "n"
    kind: ClockKind = "index" if counts and options.time_unit is None else "number"
    return ClockColumn(
        column=column, kind="stamp" if column.kind == "S" else kind, evidence="--time"
    )


def _named(name: str, layout: Layout, heading: Heading, source: str) -> Column:
    """Return the column of a name, as printed or with its unit taken off, or of a number."""
    columns = {column.field: column for column in columns_of(layout, heading)}
    folded = name.strip().casefold()
    titles = [(heading.raw[i], heading.names[i]) for i in range(layout.n_fields)]
    found = [i for i, pair in enumerate(titles) if folded in (t.casefold() for t in pair)]
    if not found and name.isdecimal() and 1 <= int(name) <= layout.n_fields:
        found = [int(name) - 1]
    if len(found) == 1 and found[0] in columns and columns[found[0]].kind in "NS":
        return columns[found[0]]
    if not found:
        what = f"{source} has no column {name!r}"
    elif len(found) > 1:
        what = f"{source} has {len(found)} columns {name!r}: give its number"
    else:
        what = f"column {name!r} of {source} holds no times"
    there = ", ".join(
        f"{i + 1} {columns[i].raw or '(no name)'}" for i in columns if columns[i].kind in "NS"
    )
    raise UsageError(what, hint=f"--time takes: {there}, or none.", code="no-such-column")


def refuse_idle_unit(columns: Columns, options: ReadOptions, source: str) -> None:
    """Refuse a unit of time where no column has one.

    Raises:
        UsageError: With code ``option-idle``.
    """
    if options.time_unit is None or any(clock.kind == "number" for clock in columns.clocks):
        return
    if not columns.clocks:
        reason, hint = "no column gives time", "Name the column with --time, or give --interval."
    elif columns.clocks[0].kind == "stamp":
        reason = f"its times ({columns.clocks[0].column.title}) are calendar stamps"
        hint = "Leave it out."
    else:
        reason = f"{columns.clocks[0].column.title} counts samples"
        hint = "Leave it out; --interval or --rate says how far apart they are."
    raise idle_option("time_unit", source, reason, hint)


def time_hint(columns: Columns, layout: Layout, heading: Heading) -> str:
    """Return what a file without time needs: an interval, or the name of a column that rises."""
    hint = "Give --interval (such as 5us) or --rate (such as 200k)"
    rising = [
        column
        for column in columns_of(layout, heading)
        if column.kind == "N"
        and column.head.size > 1
        and (column.head[1:] > column.head[:-1]).all()
    ]
    if not rising or (len(columns.values) < 2 and rising[0] in columns.values):
        return f"{hint}."
    place = rising[0].field + 1
    return (
        f"{hint}; if {rising[0].title} is time, say so with --time {place} and its unit with "
        "--time-unit."
    )


def rows_hint(lines: list[str], options: ReadOptions, sound: SoundLayouts) -> str:
    """Return what helps a text without rows of numbers: an option, if one was found to help.

    Args:
        lines: The first lines.
        options: What was overruled.
        sound: Returns the layouts under which lines are rows, with their number of rows.
    """
    given = [OPTIONS[name] for name in ("delimiter", "decimal") if getattr(options, name)]
    if given and sound(lines, replace(options, delimiter=None, decimal=None)):
        return f"Leave out {' and '.join(given)}: without, there are rows of numbers."
    for mark in _UNUSUAL:
        found = sound(lines, replace(options, delimiter=mark))
        if found and found[0][0] >= _LEAST_ROWS and found[0][1].n_fields > 1:
            return f"If {mark!r} stands between its columns, say so with --delimiter '{mark}'."
    return "Check that the capture was saved with its data."
