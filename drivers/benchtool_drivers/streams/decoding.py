"""Blocks of whole lines as rows: all at once where they are regular, one by one where not."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field, replace

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, NDArray
from benchtool_drivers.streams.digits import (
    LF,
    Fields,
    check_sums,
    decode_bytes,
    decode_decimal,
    decode_whole,
    find_fields,
)
from benchtool_drivers.streams.layout import Layout
from benchtool_drivers.streams.lineformat import START, has_sum
from benchtool_drivers.streams.lines import parse_line
from benchtool_drivers.streams.rows import ByteArray, IntArray, Rows


@frozen_record(eq=False)
class _Columns:
    """Numbers of all lines of a block; those of lines that are not ``good`` mean nothing."""

    seq: IntArray
    ticks: IntArray
    codes: NDArray[np.int8]
    good: BoolArray
    decimals: int


def decode(block: bytes, layout: Layout, first_number: int) -> Rows:
    """Return the rows of a block of whole lines.

    Args:
        block: Whole lines; its last byte is LF.
        layout: What lines look like.
        first_number: Number of its first line.
    """
    content = np.frombuffer(block, np.uint8)
    line_ends = np.flatnonzero(content == LF)
    columns = _decode_regular(content, line_ends, layout)
    rest = np.flatnonzero(~columns.good)
    if not rest.size:
        none = np.zeros(line_ends.size, np.bool_)
        return _rows(columns, none, none, first_number)
    return _with_others(block, line_ends, columns, rest, layout, first_number)


def _rows(columns: _Columns, broken: BoolArray, restarts: BoolArray, first_number: int) -> Rows:
    kept = columns.good
    numbers = np.arange(first_number, first_number + kept.size)
    return Rows(
        seq=columns.seq[kept],
        ticks=columns.ticks[kept],
        codes=columns.codes[kept],
        broken=broken,
        restarts=restarts,
        numbers=numbers[kept],
        decimals=columns.decimals,
        n_lines=kept.size,
    )


def _decode_regular(content: ByteArray, line_ends: IntArray, layout: Layout) -> _Columns:
    fields = find_fields(content, line_ends, len(layout.columns), layout.delimiter[0])
    good = np.ones(fields.lines.size, np.bool_)
    if layout.xor_sum:
        stars, good = check_sums(content, fields.starts[:, 0], fields.ends[:, -1])
        fields.ends[:, -1] = np.maximum(stars, fields.starts[:, -1])
    ticks, fine, decimals = _times(content, fields, layout)
    good &= fine
    seq = np.zeros(fields.lines.size, np.int64)
    codes = np.full(fields.lines.size, -1, np.int8)
    if layout.has_seq:
        at = layout.columns.index("seq")
        seq, fine = decode_whole(content, fields.starts[:, at], fields.ends[:, at])
        good &= fine & _within(seq, layout.seq_bits)
    if "level" in layout.columns:
        at = layout.columns.index("level")
        table = _level_table(layout)
        codes, fine = decode_bytes(content, fields.starts[:, at], fields.ends[:, at], table)
        good &= fine
    return _spread(fields, line_ends.size, seq, ticks, codes, good, decimals)


def _times(content: ByteArray, fields: Fields, layout: Layout) -> tuple[IntArray, BoolArray, int]:
    starts, ends = fields.starts[:, layout.time_column], fields.ends[:, layout.time_column]
    if layout.unit_ticks == 1:
        values, good = decode_whole(content, starts, ends)
        return values, good & _within(values, layout.wrap_bits), 0
    values, good, decimals = decode_decimal(content, starts, ends, layout.decimal[0])
    factor, rest = divmod(layout.unit_ticks, 10**decimals)
    if rest:  # digits finer than a tick: the way line by line cuts them off
        return values, np.zeros_like(good), 0
    good &= values < (1 << 62) // max(1, factor)
    return values * factor, good, decimals


def _within(values: IntArray, bits: int) -> BoolArray:
    return values < (1 << bits if bits else 1 << 62)


def _level_table(layout: Layout) -> NDArray[np.int8]:
    table = np.full(256, -1, np.int8)
    for text, code in layout.levels:
        if len(text) == 1:
            table[text[0]] = code
    return table


def _spread(
    fields: Fields,
    n: int,
    seq: IntArray,
    ticks: IntArray,
    codes: NDArray[np.int8],
    good: BoolArray,
    decimals: int,
) -> _Columns:
    """Put the numbers of the regular lines at the places of their lines."""
    if fields.lines.size == n:
        return _Columns(seq=seq, ticks=ticks, codes=codes, good=good, decimals=decimals)
    at = fields.lines
    whole = _Columns(
        seq=np.zeros(n, np.int64),
        ticks=np.zeros(n, np.int64),
        codes=np.full(n, -1, np.int8),
        good=np.zeros(n, np.bool_),
        decimals=decimals,
    )
    whole.seq[at], whole.ticks[at], whole.codes[at], whole.good[at] = seq, ticks, codes, good
    return whole


def _with_others(
    block: bytes,
    line_ends: IntArray,
    columns: _Columns,
    rest: IntArray,
    layout: Layout,
    first_number: int,
) -> Rows:
    """Look at the lines that are not regular one by one."""
    others = _Others(columns=columns, layout=layout, decimals=columns.decimals)
    starts = np.append(0, line_ends[:-1] + 1)
    for i in rest.tolist():
        others.take(i, block[int(starts[i]) : int(line_ends[i])])
    kept = np.flatnonzero(columns.good)
    broken, broken_after = _before(kept, others.garbage)
    restarts, restarts_after = _before(kept, others.restarts)
    return replace(
        _rows(columns, broken, restarts, first_number),
        broken_after=broken_after,
        restarts_after=restarts_after,
        decimals=others.decimals,
        garbage=tuple((first_number + i, line) for i, line in others.garbage.items()),
        comments=tuple((first_number + i, line) for i, line in others.comments.items()),
    )


@dataclass(slots=True)
class _Others:
    """Sorts lines that are not regular, by their place in the block."""

    columns: _Columns
    layout: Layout
    decimals: int
    garbage: dict[int, bytes] = field(default_factory=dict)
    comments: dict[int, bytes] = field(default_factory=dict)
    restarts: dict[int, bytes] = field(default_factory=dict)

    def take(self, i: int, line: bytes) -> None:
        """Sort line ``i``."""
        if not line.strip():
            return
        if self.layout.comment and line.startswith(self.layout.comment):
            self._take_comment(i, line.removesuffix(b"\r"))
            return
        row = parse_line(line, self.layout)
        if row is None:
            self.garbage[i] = line
            return
        self.decimals = max(self.decimals, row.decimals)
        columns = self.columns
        columns.seq[i], columns.ticks[i], columns.codes[i] = row.seq, row.ticks, row.code
        columns.good[i] = True

    def _take_comment(self, i: int, line: bytes) -> None:
        if not self.layout.xor_sum:
            bare = line
        elif has_sum(line):
            bare = line[:-3]
        else:
            self.garbage[i] = line
            return
        self.comments[i] = line
        if bare == START:
            self.restarts[i] = line


def _before(kept: IntArray, lines: Iterable[int]) -> tuple[BoolArray, bool]:
    """Return which of the kept lines are the first behind one of ``lines``, and if one is last."""
    marked = np.zeros(kept.size + 1, np.bool_)
    marked[np.searchsorted(kept, np.fromiter(lines, np.int64))] = True
    return marked[:-1], bool(marked[-1])
