"""The edges of the newest stretch, or of a whole one, with its gaps."""

from __future__ import annotations

from collections import deque
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from benchtool.model.arrays import BoolArray
from benchtool_drivers.streams.mishaps import Mishap, MishapList
from benchtool_drivers.streams.rows import IntArray

_START_EDGES = 1 << 12
_LEAST_EDGES = 5
"""Edges of two periods: so many stay, however long they take."""


@dataclass(slots=True)
class Piece:
    """A stretch without a gap: its ends in ticks, the level it begins with, its first edge."""

    start: int
    end: int
    starts_high: bool
    first: int


class EdgeWindow:
    """Holds edges in order, the newest ones where it is bounded.

    Args:
        most_edges: Edges held; None for all.
        most_ticks: Length held; None for any. Two periods stay in any case.

    Attributes:
        most_ticks: Length held, as above.
        begun: Whether a piece was begun.
        pieces: The stretches without a gap, oldest first; an edge's place counts from the
            beginning of all, also of those that have left.
        mishaps: What went wrong in the stretch that is held.
        first_tick: Time of the very first row.
    """

    def __init__(self, most_edges: int | None = None, most_ticks: int | None = None) -> None:
        self.begun = False
        self.pieces: deque[Piece] = deque()
        self.mishaps = MishapList()
        self.first_tick = 0
        self._most_edges = most_edges
        self.most_ticks = most_ticks
        self._ticks: IntArray = np.empty(_START_EDGES, np.int64)
        self._levels: BoolArray = np.empty(_START_EDGES, np.bool_)
        self._first = 0  # where the oldest edge stands in the arrays
        self._n = 0
        self._n_gone = 0
        self._n_closed_periods = 0

    @property
    def ticks(self) -> IntArray:
        """Times of the edges."""
        return self._ticks[self._first : self._first + self._n]

    @property
    def levels(self) -> BoolArray:
        """Level that each edge leads to."""
        return self._levels[self._first : self._first + self._n]

    @property
    def n_held(self) -> int:
        """Edges held."""
        return self._n

    @property
    def n_gone(self) -> int:
        """Edges that have left."""
        return self._n_gone

    @property
    def end_tick(self) -> int:
        """Time of the last row."""
        return self.pieces[-1].end if self.pieces else self.first_tick

    @property
    def n_periods(self) -> int:
        """Complete periods since the beginning, none across a gap."""
        return self._n_closed_periods + self._open_periods()

    def _open_periods(self) -> int:
        if not self.pieces:
            return 0
        return max(0, self._n_gone + self._n - self.pieces[-1].first - 1) // 2

    def begin(self, tick: int, *, high: bool) -> None:
        """Begin a piece that continues nothing."""
        if not self.begun:
            self.first_tick = tick
            self.begun = True
        self._n_closed_periods += self._open_periods()
        first = self._n_gone + self._n
        self.pieces.append(Piece(start=tick, end=tick, starts_high=high, first=first))
        if self._most_edges is not None and len(self.pieces) > self._most_edges + 1:
            self._give_up(self.pieces[1].first - self._n_gone)

    def extend(self, ticks: IntArray, levels: BoolArray, end_tick: int) -> None:
        """Append edges to the piece, which now reaches to ``end_tick``."""
        if self._most_edges is not None and ticks.size > self._most_edges:
            self._give_up(self._n)
            surplus = ticks.size - self._most_edges
            self._n_gone += surplus
            ticks, levels = ticks[surplus:], levels[surplus:]
        self._make_room(ticks.size)
        at = self._first + self._n
        self._ticks[at : at + ticks.size] = ticks
        self._levels[at : at + ticks.size] = levels
        self._n += ticks.size
        self.pieces[-1].end = end_tick
        self.trim()

    def retract(self, to_tick: int, *, edge: bool) -> None:
        """Take the last row back; the record reaches to ``to_tick`` again."""
        if not self.pieces:
            return
        if edge and self._n:
            self._n -= 1
        piece = self.pieces[-1]
        piece.end = to_tick
        if piece.start > to_tick:
            self.pieces.pop()
            self.begun = bool(self.pieces)
            self._n_closed_periods -= self._open_periods()

    def note(self, mishap: Mishap) -> None:
        """Note a mishap."""
        self.mishaps.add(mishap)

    def tick_of_period(self, n: int) -> int:
        """Return when the ``n``-th complete period ended, of a stretch from which none has left."""
        firsts = [piece.first for piece in self.pieces]
        for first, stop in pairwise([*firsts, self._n]):
            n_here = max(0, stop - first - 1) // 2
            if n <= n_here:
                return int(self.ticks[first + 2 * n])
            n -= n_here
        raise IndexError("so many periods are not there")

    def cut(self, end_tick: int) -> None:
        """Let go of what lies behind a time."""
        while self.pieces[-1].start > end_tick:
            self.pieces.pop()
        self.pieces[-1].end = min(end_tick, self.pieces[-1].end)
        self._n = int(np.searchsorted(self.ticks, end_tick, side="right"))

    def _make_room(self, n: int) -> None:
        """See that ``n`` edges more find a place behind the last."""
        if self._first + self._n + n <= self._ticks.size:
            return
        size = max(self._ticks.size, 2 * (self._n + n))
        ticks, levels = np.empty(size, np.int64), np.empty(size, np.bool_)
        ticks[: self._n], levels[: self._n] = self.ticks, self.levels
        self._ticks, self._levels, self._first = ticks, levels, 0

    def trim(self) -> None:
        """Let go of what is older than the window."""
        surplus = 0
        if self._most_edges is not None:
            surplus = max(0, self._n - self._most_edges)
        if self.most_ticks is not None:
            oldest = int(np.searchsorted(self.ticks, self.end_tick - self.most_ticks))
            surplus = max(surplus, min(oldest, self._n - _LEAST_EDGES))
        if surplus > 0:
            self._give_up(surplus)

    def _give_up(self, n: int) -> None:
        """Let go of the oldest ``n`` edges, and of the pieces that lie before the rest."""
        self._first += n
        self._n -= n
        self._n_gone += n
        while len(self.pieces) > 1 and self.pieces[1].first <= self._n_gone:
            self.pieces.popleft()
        if self._n:
            self.mishaps.forget_before(int(self._ticks[self._first]))
