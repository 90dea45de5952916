"""Files of numbers that are no capture, or leave open what is time: one sentence, one way out."""

from __future__ import annotations

import numpy as np

from benchtool.errors import AmbiguousStructureError, CaptureError, MalformedCaptureError
from benchtool.formats.clock import ClockScan
from benchtool.formats.text import unitwords, words
from benchtool.formats.text.column import Column, Columns
from benchtool.formats.text.heading import Heading
from benchtool.formats.text.layout import Layout
from benchtool.formats.text.metadata import Metadata
from benchtool.model.capture import ReadOptions

_LEAST_SWEPT = 8
_LEAST_WRAPPED = 3
_FINE = 20  # digits that a record must span for its repeats to be told from rounding


def refuse_tables(
    columns: Columns, layout: Layout, heading: Heading, options: ReadOptions, source: str
) -> None:
    """Refuse a table that is swept over something else than time, or holds no values.

    Raises:
        AmbiguousStructureError: If its rows are no record over time (``no-time``), or two
            columns give different times.
        MalformedCaptureError: With code ``no-values``, if it holds times and nothing else.
    """
    told = options.time is not None
    if swept := _swept(columns, told=told or options.interval_s is not None):
        raise AmbiguousStructureError(
            f"{source} is no record over time: {swept}",
            hint=_time_hint(columns, layout, heading),
            code="no-time",
        )
    if columns.rivals and not told:
        raise _rivals(columns, source)
    if not columns.values and not columns.edges:
        raise MalformedCaptureError(
            f"{source} has a time column but no column of values",
            hint="Export the channel's values with the time.",
            path=source,
            code="no-values",
        )


def _rivals(columns: Columns, source: str) -> AmbiguousStructureError:
    names = " or ".join(_shown(column) for column in columns.rivals[0])
    return AmbiguousStructureError(
        f"the channels of {source} may belong to the time in {names}, which differ",
        hint="Say which with --time, or export each channel beside its own time.",
    )


def _swept(columns: Columns, *, told: bool) -> str:
    """Say what a table is, if it is no record over time; nothing where the user tells the time."""
    if told:
        return ""
    if columns.axis is not None:
        return f"its rows are swept over {_shown(columns.axis)}"
    if any(_is_swept_within(columns, value) for value in columns.values):
        return "it holds a sweep at each time"
    if columns.values and _are_counts(columns):
        return "it counts how often each time was met"
    return ""


def _is_swept_within(columns: Columns, value: Column) -> bool:
    """Say whether a column rises while the time stays, and falls back whenever it goes on."""
    if not columns.clocks or value.kind != "N" or columns.clocks[0].kind == "stamp":
        return False
    steps, moves = np.diff(columns.clocks[0].column.head), np.diff(value.head)
    stays = steps == 0
    if moves.size < _LEAST_SWEPT or not stays.any() or stays.all():
        return False
    return bool(np.all(moves[stays] > 0) and np.all(moves[~stays] < 0)) and stays.mean() > 0.5


def _are_counts(columns: Columns) -> bool:
    """Say whether times without a name of their own stand beside nothing but numbers of hits."""
    bare = all(unitwords.time_unit(clock.column.name) is not None for clock in columns.clocks)
    return (
        bool(columns.clocks) and bare and all(words.is_count_name(c.name) for c in columns.values)
    )


def refuse_repeats(clocks: tuple[ClockScan, ...], n_rows: int, source: str) -> None:
    """Refuse rows most of which repeat a time, though its digits would tell neighbours apart.

    Raises:
        AmbiguousStructureError: Where several rows share each time, as channels or sweeps do.
    """
    for clock in clocks:
        steps = clock.steps
        fine = clock.pieces and clock.longest > _FINE * steps.resolution
        kept = clock.pieces[-1].stop if clock.pieces else 0
        if fine and not steps.coarse and clock.n_repeated > 0.5 * n_rows and kept < 0.5 * n_rows:
            step = clock.mean_step
            if step > 5 * steps.resolution:
                raise AmbiguousStructureError(
                    f"about {n_rows / kept:.0f} rows of {source} share each time: they may be "
                    "several channels, or a sweep at each time",
                    hint="Export one row a sample, one column a channel.",
                )


def refuse_rows_of_channels(columns: Columns, source: str) -> None:
    """Refuse samples of several channels in one column, told apart by another.

    Raises:
        AmbiguousStructureError: Where one column tells which channel a row is of.
    """
    if columns.key is None:
        return
    raise AmbiguousStructureError(
        f"the rows of {source} are samples of several channels, told apart by "
        f"{_shown(columns.key)}",
        hint="Export one column a channel, or one file a channel.",
    )


def refuse_thinned(metadata: Metadata, options: ReadOptions, source: str) -> None:
    """Refuse a rate beside a statement that samples were left out: it may count before or after.

    Raises:
        AmbiguousStructureError: Where only that rate gives time.
    """
    if not metadata.thinned or options.interval_s is not None:
        return
    raise AmbiguousStructureError(
        f"{source} states a sample rate, and that samples were left out ({metadata.thinned!r}): "
        "the rate may be that before or after",
        hint="Give the interval of the rows with --interval, or their rate with --rate.",
    )


def refuse_wrapped(columns: Columns, source: str) -> None:
    """Refuse columns without names whose values run on from the end of a row to the next row.

    Raises:
        AmbiguousStructureError: Where the rows may be one channel, so many samples a line.
    """
    values = columns.values
    if len(values) < _LEAST_WRAPPED or any(c.name or c.kind != "N" for c in values):
        return
    table = np.column_stack([c.head for c in values])
    if table.shape[0] < _LEAST_WRAPPED or not np.isfinite(table).all():
        return
    along = np.abs(np.diff(table, axis=0)).mean()
    onward = np.abs(table[1:, 0] - table[:-1, -1]).mean()
    if not onward < 0.5 * along:
        return
    raise AmbiguousStructureError(
        f"the {len(values)} columns of {source} have no names, and their values run on from the "
        "end of each row to the next: they may be channels, or one channel wrapped into lines",
        hint="Export one sample a line.",
    )


def refuse_lost_fractions(layout: Layout, heading: Heading, source: str) -> None:
    """Refuse clock times whose fraction was cut off by a comma that also delimits.

    Raises:
        AmbiguousStructureError: Where ``03:12:00,005`` fell into two cells.
    """
    if layout.delimiter != "," or not layout.rows or heading.is_named:
        return
    for i, kind in enumerate(layout.kinds[:-1]):
        cells = [row[i + 1] for row in layout.rows]
        clock = kind == "S" and ":" in layout.rows[0][i] and "." not in layout.rows[0][i]
        alike = len({len(cell) for cell in cells}) == 1 and len(cells[0]) in (1, 2, 3, 6)
        if clock and alike and all(cell.isdigit() for cell in cells):
            raise AmbiguousStructureError(
                f"{layout.rows[0][i]},{cells[0]} in {source} may be one time with a decimal comma, "
                "or a time and a number",
                hint="Export the capture with another delimiter or a decimal point.",
            )


def no_time(source: str, columns: Columns, layout: Layout, heading: Heading) -> CaptureError:
    """Return the error for a file without time."""
    if columns.disordered:
        return MalformedCaptureError(
            f"the time column {columns.disordered[0]!r} of {source} does not go forward",
            hint="Sort the rows by time, or give --interval to count rows instead.",
            path=source,
            code="time-disorder",
        )
    what = f"{source} has no time column and states no sample interval or rate"
    if columns.dates:
        what = f"{source} gives the day of its rows ({_shown(columns.dates[0])}) and no time of day"
    return AmbiguousStructureError(what, hint=_time_hint(columns, layout, heading), code="no-time")


def _time_hint(columns: Columns, layout: Layout, heading: Heading) -> str:
    from benchtool.formats.text.overruled import time_hint

    return time_hint(columns, layout, heading)


def refuse_bare_axis(column: Column, source: str) -> None:
    """Refuse an axis ``x`` without a unit, which may be time or anything else.

    Raises:
        AmbiguousStructureError: With code ``no-time``.
    """
    if words.is_bare_axis(column.name) and not column.unit:
        raise AmbiguousStructureError(
            f"the column {column.raw!r} of {source} has no unit: it may be time or anything else",
            hint="If it is time, give its unit with --time-unit; else export the samples against "
            "time.",
            code="no-time",
        )


def _shown(column: Column) -> str:
    return repr(column.raw) if column.raw else column.title
