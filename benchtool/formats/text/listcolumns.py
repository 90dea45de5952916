"""Columns of lists that give no time beside a state: times of edges, or how long one lasted."""

from __future__ import annotations

import numpy as np

from benchtool.formats.text import unitwords, words
from benchtool.formats.text.column import ClockColumn, Column, Columns


def listed_columns(
    columns: list[Column],
    clocks: list[ClockColumn],
    values: tuple[Column, ...],
    lengths: tuple[Column, ...],
) -> Columns | None:
    """Return the columns of such a list, if the file is one.

    Args:
        columns: The columns, from left to right.
        clocks: Those that give time.
        values: Those that may be channels.
        lengths: Those that hold lengths of time.
    """
    pair = _edge_columns(columns)
    if pair is None and not clocks and len(values) == 1:
        return _lasting_states(values[0], lengths)
    return pair


def _edge_columns(columns: list[Column]) -> Columns | None:
    """Return the two columns that hold the times of rising and of falling edges, if any."""
    numbers = [c for c in columns if c.kind == "N" and not words.is_index_name(c.name)]
    if len(numbers) != 2 or not all(_is_edge_time(c) for c in numbers):
        return None
    first, second = (c.head for c in numbers)
    size = min(first.size, second.size)
    order = np.ravel(np.column_stack([first[:size], second[:size]]))
    order = order[np.isfinite(order)]
    names = [words.edge_of(c.name) for c in numbers]
    if names[0] == names[1] or order.size < 4 or not np.all(np.diff(order) > 0):
        return None
    pair = numbers if names[0] == "rise" else numbers[::-1]
    clocks = tuple(
        ClockColumn(column=c, kind="number", evidence=f"header {c.raw!r}: edges") for c in pair
    )
    return Columns(clocks=clocks, values=(), clock_of=(), edges=True)


def _is_edge_time(column: Column) -> bool:
    timed = unitwords.time_unit(column.unit) is not None or words.is_time_name(column.name)
    return bool(words.edge_of(column.name)) and timed


def _lasting_states(value: Column, lengths: tuple[Column, ...]) -> Columns | None:
    """Return the columns of a list of states and how long each lasted, if they are one."""
    told = value.head[np.isfinite(value.head)]
    states = value.kind == "W" or (told.size > 2 and set(told.tolist()) == {0.0, 1.0})
    if len(lengths) != 1 or not states or not words.is_lasting(lengths[0].name):
        return None
    evidence = f"header {lengths[0].raw!r}: how long each state lasted"
    clock = ClockColumn(column=lengths[0], kind="number", evidence=evidence)
    return Columns(clocks=(clock,), values=(value,), clock_of=(0,), lasting=True)
