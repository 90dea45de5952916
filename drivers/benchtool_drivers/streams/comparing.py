"""One row held against another: does it continue it, and if not, what happened."""

from __future__ import annotations

from typing import Literal, NamedTuple

from benchtool_drivers.streams.block import NO_LEVEL, Block
from benchtool_drivers.streams.layout import Layout

Found = Literal["next", "lost", "level", "back", "repeated"]


class TakenRow(NamedTuple):
    """A row by its numbers as printed; a tuple, as one is made for each row that is doubtful.

    Attributes:
        seq: Its number.
        raw: Its time or length as printed, in ticks.
        level: The level it leads to; -1 where it gives none.
        beat: Whether it is a heartbeat.
        line: Number of its line.
        tick: Its time unrolled, once it was taken.
        parted: Whether it began a piece of the record.
    """

    seq: int
    raw: int
    level: int
    beat: bool
    line: int
    tick: int = 0
    parted: bool = False


def row_of(block: Block, i: int) -> TakenRow:
    """Return row ``i`` of a block."""
    return TakenRow(
        seq=int(block.rows.seq[i]),
        raw=int(block.rows.ticks[i]),
        level=int(block.levels[i]),
        beat=bool(block.beats[i]),
        line=int(block.rows.numbers[i]),
    )


def step_between(last: TakenRow, row: TakenRow, layout: Layout) -> int:
    """Return the ticks from one row to another; below 0 where time goes back."""
    if layout.has_interval:
        return row.raw
    return _signed(row.raw - last.raw, layout.wrap_bits)


def turns_between(last: TakenRow, row: TakenRow, layout: Layout) -> int:
    """Return by how much the sequence number went on."""
    return _signed(row.seq - last.seq, layout.seq_bits)


def _signed(step: int, bits: int) -> int:
    """Return a difference of a counter of so many bits as the nearest it can be."""
    if not bits:
        return step
    step &= (1 << bits) - 1
    return step - (1 << bits) if step >= 1 << (bits - 1) else step


def compare(last: TakenRow, row: TakenRow, layout: Layout) -> tuple[Found, int]:
    """Return what a row is to the one before it, and how many edges are missing between them."""
    step = step_between(last, row, layout)
    if layout.has_seq:
        missing = turns_between(last, row, layout) - (not row.beat)
        if missing < 0:
            return "repeated", 0
        if missing:
            return ("lost", missing) if step > 0 else ("back", 0)
    if step < 0:
        return "back", 0
    if row.level == NO_LEVEL:
        return "next", 0
    same = row.level == last.level
    if same and step == 0 and not (row.beat or layout.has_seq):
        return "repeated", 0
    return ("next", 0) if same == row.beat else ("level", 1)
