"""What the rows of a text are: samples, or transitions of states."""

from __future__ import annotations

import numpy as np

from benchtool.formats.steps import examine_steps
from benchtool.formats.text.cells import UNKNOWN_WORDS, number
from benchtool.formats.text.column import Column
from benchtool.formats.text.states import converter
from benchtool.formats.text.structure import Structure
from benchtool.model.arrays import FloatArray, NDArray, distinct

_CHANGING = 0.4  # of the rows bring a change in a list of transitions, few in sampled states


def head_stamps(structure: Structure, clock: int) -> FloatArray:
    """Return the first stamps of a clock, decoded."""
    wanted = structure.cells[clock].wanted
    rows = structure.layout.rows
    if wanted.convert is None:
        return structure.columns.clocks[clock].column.head
    cells = [
        row[wanted.field] if wanted.second is None else f"{row[wanted.second]} {row[wanted.field]}"
        for row in rows
    ]
    return wanted.convert(cells)


def may_be_lists(structure: Structure) -> bool:
    """Say whether the first rows can be transitions and not samples."""
    columns = structure.columns
    if columns.edges or columns.lasting:
        return True
    if not columns.clocks or any(clock.kind == "index" for clock in columns.clocks):
        return False
    heads = [held(_head_values(structure, c), structure, c) for c in columns.values]
    stamps = [head_stamps(structure, k) for k in range(len(columns.clocks))]
    if columns.key is not None:
        return _changes_by_channel(structure, heads)
    return all(
        is_transition_list(
            stamps[k],
            [h for h, of in zip(heads, columns.clock_of, strict=True) if of == k],
            structure.cells[k].resolution,
        )
        for k in range(len(columns.clocks))
    )


def _head_values(structure: Structure, column: Column) -> FloatArray:
    cells = [row[column.field] for row in structure.layout.rows]
    convert = converter(column)
    if convert is not None:
        return convert(cells)
    return np.array([number(cell, structure.layout.decimal) for cell in cells])


def _changes_by_channel(structure: Structure, heads: list[FloatArray]) -> bool:
    """Say whether rows told apart by channel are states that change from row to row."""
    key = structure.columns.key
    if key is None or len(heads) != 1:
        return False
    names = [row[key.field] for row in structure.layout.rows]
    values = heads[0]
    if np.unique(values[np.isfinite(values)]).size != 2:
        return False
    last: dict[str, float] = {}
    n_same = 0
    for name, value in zip(names, values.tolist(), strict=True):
        n_same += last.get(name) == value
        last[name] = value
    return n_same <= 0.1 * len(names)


def held(values: FloatArray, structure: Structure, column: Column) -> FloatArray:
    """Let a state hold on over the empty cells below it, where no cell names an unknown one."""
    cells = [row[column.field] for row in structure.layout.rows]
    if "" not in cells or any(cell.lower() in UNKNOWN_WORDS for cell in cells):
        return values
    told = np.where(np.isfinite(values), np.arange(values.size), 0)
    return values[np.maximum.accumulate(told)]


def is_transition_list(stamps: FloatArray, columns: list[FloatArray], resolution: float) -> bool:
    """Say whether rows are transitions and not samples.

    Args:
        stamps: First stamps, in the column's unit.
        columns: First values of every channel, NaN for unknown states.
        resolution: Last printed digit of the stamps.
    """
    rows = np.isfinite(stamps)
    stamps, columns = stamps[rows], [c[rows] for c in columns]
    if stamps.size < 2 or not columns or not all(_two_valued(c) for c in columns):
        return False
    changes = np.zeros(stamps.size - 1, bool)
    for column in columns:
        changes |= ~same(column[1:], column[:-1])
    if changes.all() and stamps.size > 2:
        return True
    uneven = not examine_steps(stamps, resolution).even
    return uneven and int(np.count_nonzero(changes)) >= _CHANGING * changes.size


def same(a: FloatArray, b: FloatArray) -> NDArray[np.bool_]:
    """Say which values are the same, unknown ones among them."""
    same: NDArray[np.bool_] = (a == b) | (np.isnan(a) & np.isnan(b))
    return same


def _two_valued(values: FloatArray) -> bool:
    return distinct(values[np.isfinite(values)]).size in (1, 2)
