"""A block of rows held against each other, all at once."""

from __future__ import annotations

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, NDArray
from benchtool_drivers.streams.layout import Layout
from benchtool_drivers.streams.rows import IntArray, Rows

NO_LEVEL = -1


@frozen_record(eq=False)
class Block:
    """Rows with what lies between each and the one before it.

    Attributes:
        rows: The rows.
        levels: Level after each, 1 or 0; -1 where the lines give none.
        beats: Which are heartbeats.
        steps: Ticks since the row before; of the first, 0.
        doubts: Places of the rows that do not simply continue the row before, in order.
    """

    rows: Rows
    levels: NDArray[np.int8]
    beats: BoolArray
    steps: IntArray
    doubts: IntArray


def make_block(rows: Rows, layout: Layout) -> Block:
    """Return rows with what lies between them."""
    beats = rows.codes >= 2
    levels = np.where(rows.codes >= 0, rows.codes & 1, NO_LEVEL).astype(np.int8)
    if layout.level_before:
        levels[~beats] ^= 1
    steps, forward = _steps(rows.ticks, layout)
    sound = forward & ~rows.restarts[1:]
    if layout.has_seq:
        turned = np.diff(rows.seq)
        if layout.seq_bits:
            turned &= (1 << layout.seq_bits) - 1
        sound &= turned == ~beats[1:]
    else:
        sound &= ~rows.broken[1:]
    if "level" in layout.columns:
        sound &= (levels[1:] == levels[:-1]) == beats[1:]
    if not layout.has_seq and not layout.has_interval:
        sound &= (steps[1:] > 0) | (levels[1:] != levels[:-1])
    return Block(
        rows=rows, levels=levels, beats=beats, steps=steps, doubts=np.flatnonzero(~sound) + 1
    )


def _steps(ticks: IntArray, layout: Layout) -> tuple[IntArray, BoolArray]:
    """Return the ticks between the rows, and which of these steps go forward."""
    if layout.has_interval:
        return ticks, ticks[1:] >= 0
    steps = np.diff(ticks, prepend=ticks[:1])
    if layout.wrap_bits:
        steps &= (1 << layout.wrap_bits) - 1
        return steps, steps[1:] < 1 << (layout.wrap_bits - 1)
    return steps, steps[1:] >= 0
