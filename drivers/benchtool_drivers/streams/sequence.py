"""From rows as printed to edges in order: counters unrolled, and every loss a gap."""

from __future__ import annotations

from collections import deque
from typing import Protocol

import numpy as np

from benchtool.errors import ReplyError, Step
from benchtool.model.arrays import BoolArray
from benchtool_drivers.streams.block import NO_LEVEL, Block, make_block
from benchtool_drivers.streams.comparing import (
    TakenRow,
    compare,
    row_of,
    step_between,
    turns_between,
)
from benchtool_drivers.streams.layout import Layout
from benchtool_drivers.streams.mishaps import GAPS, Kind, Mishap
from benchtool_drivers.streams.rows import IntArray, Rows

_DROPS_TO_RESTART = 3
_LATENCY_S = 0.1  # common practice: serial adapters hold a line back for tens of milliseconds
_REMEMBERED = 4096  # rows, so that lines that come again are known


class Sink(Protocol):
    """Takes edges in order."""

    begun: bool

    def begin(self, tick: int, *, high: bool) -> None:
        """Begin a piece that continues nothing."""
        ...

    def extend(self, ticks: IntArray, levels: BoolArray, end_tick: int) -> None:
        """Append edges to the piece, which now reaches to ``end_tick``."""
        ...

    def retract(self, to_tick: int, *, edge: bool) -> None:
        """Take the last row back, an edge or not; the record reaches to ``to_tick`` again."""
        ...

    def note(self, mishap: Mishap) -> None:
        """Note a mishap."""
        ...


class Sequencer:
    """Holds each row against the one before.

    Args:
        layout: What the numbers mean.
        source: Name of the stream, for errors.
        sinks: Who takes the edges; may be added to and removed from between calls.

    Attributes:
        n_rows: Rows taken, edges and heartbeats.
    """

    def __init__(self, layout: Layout, source: str, sinks: list[Sink]) -> None:
        self.n_rows = 0
        self._layout = layout
        self._source = source
        self._sinks = sinks
        self._last: TakenRow | None = None
        self._before_last: TakenRow | None = None
        self._pending: Kind | None = None
        self._n_dropped = 0
        self._astray = False  # the row before was not taken: the next is held against the last
        self._recent: deque[tuple[IntArray, IntArray]] = deque(maxlen=64)

    @property
    def last_tick(self) -> int:
        """Time of the last row, in ticks since the first."""
        return self._last.tick if self._last else 0

    def interrupt(self, kind: Kind) -> None:
        """Say that something was lost before the next row, or that it begins anew."""
        if self._pending is None or kind == "restart":
            self._pending = kind

    def feed(self, rows: Rows, silent_s: float = 0.0) -> None:
        """Take rows.

        Args:
            rows: The rows.
            silent_s: Seconds for which nothing had come right before them.

        Raises:
            ReplyError: ``stream-level-lost``: the lines give no level, and one was lost.
        """
        n, i = rows.ticks.size, 0
        if n:
            block = make_block(rows, self._layout)
            self._weigh_silence(silent_s)
        while i < n:
            if i == 0 or self._astray or self._pending:
                self._take_one(block, i)
                i += 1
                continue
            at = int(np.searchsorted(block.doubts, i))
            stop = int(block.doubts[at]) if at < block.doubts.size else n
            self._take_run(block, i, stop)
            if stop < n:
                self._take_one(block, stop)
            i = stop + 1
        if rows.broken_after and not self._layout.has_seq:
            self.interrupt("garbage")
        if rows.restarts_after:
            self.interrupt("restart")

    def _weigh_silence(self, silent_s: float) -> None:
        """Part the record where the counter may have turned unseen."""
        if self._last is None or not self._layout.wrap_bits:
            return
        half_turn_s = (1 << (self._layout.wrap_bits - 1)) / self._layout.tick_hz
        if silent_s > half_turn_s + _LATENCY_S:
            self.interrupt("silent")

    def _take_run(self, block: Block, i: int, stop: int) -> None:
        """Take rows that each continue the one before."""
        last = self._last
        if stop <= i or last is None:
            return
        ticks = last.tick + np.cumsum(block.steps[i:stop])
        levels = block.levels[i:stop]
        if levels[0] == NO_LEVEL:
            levels = (last.level + 1 + np.arange(stop - i)) & 1
        taken = row_of(block, stop - 1)._replace(tick=int(ticks[-1]), level=int(levels[-1]))
        if stop - i > 1:
            before = row_of(block, stop - 2)
            last = before._replace(tick=int(ticks[-2]), level=int(levels[-2]))
        self._before_last, self._last = last, taken
        self._remember(block.rows, max(i, stop - _REMEMBERED), stop)
        edges = ~block.beats[i:stop]
        self._hand_on(ticks[edges], levels[edges] == 1, taken.tick, first_high=levels[0] == 1)
        self.n_rows += stop - i

    def _take_one(self, block: Block, i: int) -> None:
        """Take a row that may not continue the one before, or drop it."""
        row, last = row_of(block, i), self._last
        if block.rows.restarts[i]:
            self.interrupt("restart")
        elif block.rows.broken[i] and not self._layout.has_seq:
            self.interrupt("garbage")
        if last is None:
            self._pending = None
            self._begin(row._replace(level=self._first_level(row)))
        elif self._pending:
            kind, self._pending = self._pending, None
            self._part(row, last, kind, 1)
        elif self._is_known(row):
            self._astray = True
            self._note("repeated", row)
        else:
            self._weigh(row, last)
        self._remember(block.rows, i, i + 1)

    def _weigh(self, row: TakenRow, last: TakenRow) -> None:
        """Take or drop a row by how it stands to the last."""
        found, n_missing = compare(last, row, self._layout)
        if found == "next":
            self._continue(row, last)
        elif found in ("lost", "level"):
            self._part(row, last, found, n_missing)
        elif self._last_is_wrong(row, found):
            self._take_back(row)
        else:
            self._drop(row, last, found)

    def _drop(self, row: TakenRow, last: TakenRow, found: Kind) -> None:
        self._n_dropped += 1
        self._astray = True
        if self._n_dropped >= _DROPS_TO_RESTART:
            self._part(row, last, "restart", 1)
            return
        self._note(found, row)

    def _last_is_wrong(self, row: TakenRow, found: Kind) -> bool:
        """Return whether the row before the last speaks for this row and against the last."""
        before, last = self._before_last, self._last
        if before is None or last is None or self._layout.has_interval or self._n_dropped:
            return False
        ahead = compare(before, row, self._layout)[0] not in ("back", "repeated")
        return ahead and (last.parted or found == "back")

    def _take_back(self, row: TakenRow) -> None:
        """Take the last row back; this one stays only where its number vouches for it."""
        before, last = self._before_last, self._last
        if before is None or last is None:
            return
        for sink in self._sinks:
            sink.retract(before.tick, edge=not last.beat)
        self._note("garbage", last)
        self._last, self._before_last = before, None
        if last.parted:
            self._part(row, before, "lost", max(1, self._n_missing(before, row)))
            return
        self._n_dropped += 1
        self._astray = True
        self._note("back", row)
        if not self._layout.has_seq:
            self.interrupt("garbage")

    def _n_missing(self, last: TakenRow, row: TakenRow) -> int:
        if not self._layout.has_seq:
            return 1
        return turns_between(last, row, self._layout) - (not row.beat)

    def _continue(self, row: TakenRow, last: TakenRow) -> None:
        tick = last.tick + step_between(last, row, self._layout)
        level = last.level ^ 1 if row.level == NO_LEVEL else row.level
        self._keep(row._replace(tick=tick, level=level))

    def _part(self, row: TakenRow, last: TakenRow, kind: Kind, n: int) -> None:
        """Take a row as the first of a new piece."""
        step = step_between(last, row, self._layout)
        tick = last.tick + max(1, step)
        level = row.level if row.level != NO_LEVEL else self._level_after_loss(row, last, kind)
        if kind in GAPS:
            self._note(kind, row, n)
        self._begin(row._replace(tick=tick, level=level, parted=True))

    def _begin(self, row: TakenRow) -> None:
        for sink in self._sinks:
            sink.begin(row.tick, high=(row.level == 1) == row.beat)
        self._keep(row)

    def _keep(self, row: TakenRow) -> None:
        self._before_last, self._last = self._last, row
        self._n_dropped = 0
        self._astray = False
        self.n_rows += 1
        n = int(not row.beat)
        levels = np.full(n, row.level == 1)
        self._hand_on(np.full(n, row.tick), levels, row.tick, first_high=row.level == 1)

    def _hand_on(
        self, ticks: IntArray, levels: BoolArray, end_tick: int, *, first_high: bool
    ) -> None:
        """Give edges to all sinks; to one that is new, from the first edge on."""
        for sink in self._sinks:
            if not sink.begun:
                start = int(ticks[0]) if ticks.size else end_tick
                sink.begin(start, high=not levels[0] if ticks.size else first_high)
            sink.extend(ticks, levels, end_tick)

    def _first_level(self, row: TakenRow) -> int:
        return row.level if row.level != NO_LEVEL else int(bool(self._layout.first_level))

    def _level_after_loss(self, row: TakenRow, last: TakenRow, kind: Kind) -> int:
        """Return the level of an edge after others were lost, where their number tells it."""
        if kind == "lost" and self._layout.has_seq:
            return last.level ^ (turns_between(last, row, self._layout) & 1)
        raise ReplyError(
            f"{self._source} lost an edge before line {row.line}, and its lines do not say "
            "which level an edge leads to",
            hint="start the logger again and connect anew; let it print the level, or number its "
            "lines, and such a loss costs nothing but a gap",
            step=Step(resource=self._source, last_good=f"line {last.line}"),
            code="stream-level-lost",
        )

    def _note(self, kind: Kind, row: TakenRow, n: int = 1) -> None:
        mishap = Mishap(kind=kind, tick=self.last_tick, n=n, line=row.line)
        for sink in self._sinks:
            sink.note(mishap)

    def _remember(self, rows: Rows, start: int, stop: int) -> None:
        if self._layout.has_seq:
            self._recent.append((rows.seq[start:stop], rows.ticks[start:stop]))

    def _is_known(self, row: TakenRow) -> bool:
        """Return whether a line that is no heartbeat came before, number and time alike."""
        if not self._layout.has_seq or row.beat:
            return False
        last = self._last
        if last is not None and turns_between(last, row, self._layout) > 0:
            return False
        return any(
            bool(((seq == row.seq) & (ticks == row.raw)).any()) for seq, ticks in self._recent
        )
