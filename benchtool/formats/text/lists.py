"""Lists of transitions in their variants, from the rows of a text.

A time and the states taken on then; columns of times a channel each; one column that tells the
channel of a row; how long each state lasted; the times of rising and of falling edges.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from benchtool.errors import MalformedCaptureError
from benchtool.formats.text.cells import number
from benchtool.formats.text.column import Column
from benchtool.formats.text.refusals import refuse_rows_of_channels
from benchtool.formats.text.rowkinds import held, is_transition_list
from benchtool.formats.text.scanning import Scan, scan_rows
from benchtool.formats.text.states import converter
from benchtool.formats.text.structure import Structure
from benchtool.formats.text.transitions import (
    Listed,
    names_edges,
    read_transitions,
)
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.capture import LogicTrace
from benchtool.model.quantity import Notice


@frozen_record(eq=False)
class Lists:
    """Traces read from lists of transitions, and the walk that found them."""

    scan: Scan
    traces: tuple[LogicTrace, ...]
    notices: tuple[Notice, ...]


def read_lists(structure: Structure, source: str) -> Lists | None:
    """Read lists of transitions; None if later rows show that they are samples.

    Args:
        structure: The structure, which :func:`may_be_lists`.
        source: File name, for errors.

    Raises:
        MalformedCaptureError: If the times run backwards.
    """
    columns = structure.columns
    n_channels = len(columns.clocks) + len(columns.values) + (columns.key is not None)
    scan = scan_rows(structure.rows, (), n_channels, (None,) * n_channels, keep=True)
    table = scan.table
    if table is None or not table.size:
        return None
    found = list(_listed(structure, table))
    plain = not (columns.edges or columns.lasting or columns.key)
    if plain and not all(_is_list(structure, each) for each in found):
        return None
    read = [_traces(structure, each, source) for each in found]
    return Lists(
        scan=scan,
        traces=tuple(trace for traces, _ in read for trace in traces),
        notices=tuple(notice for _, notices in read for notice in notices),
    )


_Found = tuple[int, FloatArray, list[Listed]]
"""A clock, the stamps of its rows, and the channels listed by them."""


def _is_list(structure: Structure, found: _Found) -> bool:
    clock, stamps, channels = found
    values = [channel.values for channel in channels]
    return is_transition_list(stamps, values, structure.cells[clock].resolution)


def _traces(
    structure: Structure, found: _Found, source: str
) -> tuple[tuple[LogicTrace, ...], tuple[Notice, ...]]:
    clock, stamps, channels = found
    cells = structure.cells[clock]
    return read_transitions(
        stamps,
        channels,
        cells.resolution,
        structure.units[clock].unit,
        source,
        from_zero=not cells.relative,
    )


def _listed(structure: Structure, table: FloatArray) -> Iterator[_Found]:
    """Yield each clock with its stamps and the channels that are listed by them."""
    columns = structure.columns
    if columns.edges:
        yield _edges(table)
    elif columns.lasting:
        yield _lasting(structure, table)
    elif columns.key is not None:
        yield from _by_channel(structure, table)
    else:
        n_clocks = len(columns.clocks)
        for k in range(n_clocks):
            channels = [
                _channel(structure, column, table[:, n_clocks + i])
                for i, column in enumerate(columns.values)
                if columns.clock_of[i] == k
            ]
            yield k, table[:, k], channels


def _channel(structure: Structure, column: Column, values: FloatArray) -> Listed:
    cells = [row[column.field] for row in structure.layout.rows]
    return Listed(
        title=column.title, values=held(values, structure, column), worded=names_edges(cells)
    )


def _edges(table: FloatArray) -> _Found:
    """Return the times of rising and falling edges as one list."""
    stamps = np.concatenate([table[:, 0], table[:, 1]])
    states = np.repeat([1.0, 0.0], table.shape[0])
    order = np.argsort(stamps, kind="stable")
    order = order[np.isfinite(stamps[order])]
    return 0, stamps[order], [Listed(title="edges", values=states[order], worded=True)]


def _lasting(structure: Structure, table: FloatArray) -> _Found:
    """Return how long each state lasted as a list of when it began."""
    lengths = table[:, 0]
    if not np.all(lengths[np.isfinite(lengths)] >= 0):
        raise MalformedCaptureError(
            f"a state lasts less than no time ({structure.columns.clocks[0].column.raw!r})",
            hint="Look at the column of durations.",
            code="time-disorder",
        )
    stamps = np.concatenate([[0.0], np.cumsum(np.nan_to_num(lengths))])
    states = np.append(table[:, 1], table[-1:, 1])
    column = structure.columns.values[0]
    return 0, stamps, [Listed(title=column.title, values=states, worded=False)]


def _by_channel(structure: Structure, table: FloatArray) -> Iterator[_Found]:
    """Yield the rows of each channel as a list of its own."""
    columns, key = structure.columns, table[:, -1]
    if columns.key is None or len(columns.clocks) != 1 or len(columns.values) != 1:
        refuse_rows_of_channels(columns, structure.rows.content.source)
        return
    names = {
        float(code): name
        for row in structure.layout.rows
        for name, code in ((row[columns.key.field], _code(structure, row[columns.key.field])),)
    }
    column = columns.values[0]
    for code in np.unique(key[np.isfinite(key)]).tolist():
        rows = key == code
        cells = [r[column.field] for r in structure.layout.rows]
        name = names.get(code, f"{code:g}")
        title = f"{columns.key.title} {name}" if name.isdigit() else name
        listed = Listed(title=title, values=table[rows, 1], worded=names_edges(cells))
        yield 0, table[rows, 0], [listed]


def _code(structure: Structure, name: str) -> float:
    key = structure.columns.key
    assert key is not None
    convert = converter(key)
    return float(convert([name])[0]) if convert else number(name, structure.layout.decimal)
