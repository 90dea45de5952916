"""Time from a column of stamps: even or not, its step, its holes, its restarts.

Stamps arrive in blocks, as the file gives them, and are never held as a whole: of each block
only the chord between its first and last stamp is kept, and how far the stamps between lie
from it. If all chord ends lie on one straight line the column is even.
"""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np

from benchtool.errors import MalformedCaptureError
from benchtool.formats.longsteps import LONG, LongSteps
from benchtool.formats.pieces import Piece, parted
from benchtool.formats.steps import Steps
from benchtool.model.arrays import FloatArray, NDArray

_SLACK = 0.01  # of a step: stamps that near to the grid lose nothing by being put on it
_HARMLESS = 0.1 * _SLACK  # of a step: a bound so small need not be replaced by what is there
_RESTART = 0.05  # a step back into this part of the segment is a restart
_MOST_BACKWARDS = 0.05  # of all rows
_LEAST_DIGITS = 3  # that a piece spans: the step of a grid of fewer is as good as unknown
_HELD = 2  # rows kept back, so that a backward step is judged with its neighbours in sight

IntArray = NDArray[np.int64]


class ClockScan:
    """Takes a column of stamps block by block and finds its pieces and unusable rows.

    Args:
        steps: What the first stamps say.
        source: File name, for errors.

    Attributes:
        n_doubtful: Steps of two digits, so few that a row may as well be lost there.
    """

    def __init__(self, steps: Steps, source: str) -> None:
        self.steps = steps
        self.pieces: list[Piece] = []
        self.n_unreadable = 0
        self.n_backwards = 0
        self.n_repeated = 0
        self.n_doubtful = 0
        self._source = source
        self._dropped: list[IntArray] = []
        self._n_fed = 0
        self._n_kept = 0
        self._last: float | None = None
        self._origin: float | None = None
        self._peak = -math.inf
        self._held_rows: IntArray = np.empty(0, np.int64)
        self._held: FloatArray = np.empty(0)
        self._last_row = -1
        one_digit = steps.even and steps.coarse and steps.typical > 0
        self._long = LongSteps(steps.typical) if one_digit else None

    @property
    def dropped(self) -> IntArray:
        """Rows that take no part, in order."""
        return np.sort(np.concatenate([np.empty(0, np.int64), *self._dropped]))

    def feed(self, stamps: FloatArray) -> None:
        """Take the next stamps, NaN where a row has none."""
        if self._runs_on(stamps):
            return
        readable = np.isfinite(stamps)
        rows = np.arange(self._n_fed, self._n_fed + stamps.size)
        self._n_fed += stamps.size
        self.n_unreadable += self._drop(rows[~readable])
        rows = np.concatenate([self._held_rows, rows[readable]])
        stamps = np.concatenate([self._held, stamps[readable]])
        cut = max(0, rows.size - _HELD)
        self._held_rows, self._held = rows[cut:], stamps[cut:]
        self._take(rows[:cut], stamps[:cut], self._held)

    def _runs_on(self, stamps: FloatArray) -> bool:
        """Take stamps that only go on, without a hole; say whether they do."""
        if not self.steps.even or self._last is None or stamps.size < _HELD:
            return False
        run = np.concatenate([[self._last], self._held, stamps])
        steps = run[1:] - run[:-1]
        low, high = float(steps.min()), float(steps.max())
        least, most = self._long.plain if self._long else (0.0, self.steps.gap)
        if not (low > least and high <= most):  # NaN is neither
            return False
        self._n_fed += stamps.size
        self._last_row = self._n_fed - _HELD - 1 if stamps.size > _HELD else self._held_rows[-1]
        self._held_rows, self._held = np.arange(self._n_fed - _HELD, self._n_fed), run[-_HELD:]
        taken = run[1:-_HELD]
        # a path with steps between two limits cannot leave its chord further than this
        at_most = taken.size * (high - low) / 4
        known = at_most if at_most <= _HARMLESS * self.steps.typical else None
        self._extend(taken, opens=False, restarts=False, sag=known)
        self._last = float(taken[-1])
        self._peak = max(self._peak, self._last)
        return True

    def finish(self) -> None:
        """Take what was held back.

        Raises:
            MalformedCaptureError: If more than a few rows step backwards.
        """
        self._take(self._held_rows, self._held, np.empty(0))
        self._part_at_lost_rows()
        n_restarts = sum(piece.restarts for piece in self.pieces)
        if self.n_backwards > max(_MOST_BACKWARDS * self._n_fed, 1) or (
            2 * n_restarts > max(2, self._n_kept)
        ):
            raise self._disorder()

    def _drop(self, rows: IntArray) -> int:
        if rows.size:
            self._dropped.append(rows)
        return int(rows.size)

    def _take(self, rows: IntArray, stamps: FloatArray, ahead: FloatArray) -> None:
        if not rows.size:
            return
        if self._origin is None:
            self._origin = float(stamps[0])
        rows, stamps = self._without_backwards(rows, stamps, ahead)
        rows, stamps = self._without_repeats(rows, stamps)
        if rows.size:
            self._lay(rows, stamps)

    def _steps_of(self, stamps: FloatArray) -> FloatArray:
        """Return the step before each stamp, 0 before the very first."""
        before = stamps[0] if self._last is None else self._last
        return np.diff(stamps, prepend=before)

    def _without_backwards(
        self, rows: IntArray, stamps: FloatArray, ahead: FloatArray
    ) -> tuple[IntArray, FloatArray]:
        """Drop single rows whose stamp is out of order; restarts stay."""
        for _ in range(8):
            later = np.concatenate([stamps, ahead])
            back = np.flatnonzero(self._steps_of(later)[: rows.size + 1] < 0)
            back = back[~self._is_restart(later, back)]
            wrong = np.array(sorted({self._culprit(later, int(i)) for i in back}), np.int64)
            wrong = wrong[(wrong >= 0) & (wrong < rows.size)]
            if not wrong.size:
                return rows, stamps
            if self.n_backwards > _MOST_BACKWARDS * self._n_fed + 50:
                raise self._disorder()
            self.n_backwards += self._drop(rows[wrong])
            rows, stamps = np.delete(rows, wrong), np.delete(stamps, wrong)
            if not rows.size:
                return rows, stamps
        raise self._disorder()

    def _is_restart(self, stamps: FloatArray, back: IntArray) -> NDArray[np.bool_]:
        assert self._origin is not None
        peak = np.maximum(np.maximum.accumulate(stamps), self._peak)[np.maximum(back - 1, 0)]
        fall = self._steps_of(stamps)[back]
        before, after = stamps[back] - fall, stamps[np.minimum(back + 1, stamps.size - 1)]
        earlier = np.where(back >= 2, stamps[np.maximum(back - 2, 0)], before)
        if self._last is not None:
            earlier[back == 1] = self._last
        length = peak - self._origin
        near = self._origin + np.maximum(_RESTART * length, 2 * self.steps.resolution)
        fell_far = (fall < -0.5 * length) | (stamps[back] <= self._origin)
        leapt = stamps[back] >= earlier  # the row before leapt ahead, and time goes on here
        return (stamps[back] <= near) & fell_far & (after < before) & ~leapt

    def _culprit(self, stamps: FloatArray, i: int) -> int:
        """Say which of the two rows around the backward step at ``i`` is out of order."""
        before = stamps[i - 2] if i >= 2 else self._last
        if i >= 1 and before is not None and stamps[i] >= before:
            return i - 1  # the row before leapt ahead
        return i

    def _without_repeats(self, rows: IntArray, stamps: FloatArray) -> tuple[IntArray, FloatArray]:
        """Drop rows that repeat a stamp, unless the digits are too few to tell stamps apart."""
        if not rows.size:
            return rows, stamps
        repeated = self._steps_of(stamps) == 0
        if self._last is None:
            repeated[0] = False
        self.n_repeated += int(np.count_nonzero(repeated))
        if self.steps.even and self.steps.coarse:
            return rows, stamps
        self._drop(rows[repeated])
        return rows[~repeated], stamps[~repeated]

    def _lay(self, rows: IntArray, stamps: FloatArray) -> None:
        """Append the stamps to the pieces."""
        steps = self._steps_of(stamps)
        back = steps < 0
        breaks = back | self._holes(rows, steps) if self.steps.even else back
        if self._long:
            inside = ~breaks
            inside[0] &= self._last is not None
            self._long.note(steps, stamps, self._n_kept, inside)
        edges = [0, *np.flatnonzero(breaks).tolist(), stamps.size]
        for k, (start, stop) in enumerate(pairwise(edges)):
            if start < stop:
                opens = k > 0 or not self.pieces
                self._extend(stamps[start:stop], opens=opens, restarts=bool(back[start]))
        self._last, self._last_row = float(stamps[-1]), int(rows[-1])
        self._peak = max(self._peak, float(np.max(stamps)))

    def _holes(self, rows: IntArray, steps: FloatArray) -> NDArray[np.bool_]:
        """Say before which rows others are missing: a long step, and less where one was dropped."""
        dropped = np.diff(rows, prepend=self._last_row) > 1
        holes: NDArray[np.bool_] = steps > self.steps.gap
        return holes | (dropped & (steps >= LONG * self.steps.typical))

    def _part_at_lost_rows(self) -> None:
        """Part the pieces at steps of two digits that no rounding of an even time explains."""
        long = self._long
        if long is None or not long.may_be_lost_rows(self._n_kept):
            return
        ends = [piece.ends for piece in self.pieces]
        if long.are_spread_evenly(ends):
            self.n_doubtful = long.n if long.tell_little(ends) else 0
        else:
            self.pieces = [part for piece in self.pieces for part in parted(piece, long)]

    def _extend(
        self, stamps: FloatArray, *, opens: bool, restarts: bool, sag: float | None = None
    ) -> None:
        first, last = float(stamps[0]), float(stamps[-1])
        if opens:
            self.pieces.append(Piece(first=self._n_kept, first_t=first, restarts=restarts))
        piece = self.pieces[-1]
        start, stop = self._n_kept, self._n_kept + stamps.size - 1
        piece.chords.append((start, first, stop, last))
        if sag is None and stamps.size > 2:
            chord = first + np.arange(stamps.size) * ((last - first) / (stamps.size - 1))
            sag = float(np.max(np.abs(stamps - chord)))
        piece.sag = max(piece.sag, sag or 0.0)
        self._n_kept = stop + 1

    def _disorder(self) -> MalformedCaptureError:
        return MalformedCaptureError(
            f"the time column of {self._source} runs backwards in too many rows",
            hint="Sort the rows by time, or count them with --time none and --interval.",
            path=self._source,
            code="time-disorder",
        )

    @property
    def mean_step(self) -> float:
        """Mean step over all pieces, in the column's unit; 0 where no piece has two rows."""
        n_steps = sum(piece.stop - piece.first - 1 for piece in self.pieces)
        span = sum(piece.last_t - piece.first_t for piece in self.pieces)
        return span / n_steps if n_steps else 0.0

    @property
    def longest(self) -> float:
        """Length of the longest piece, in the column's unit."""
        return max(piece.last_t - piece.first_t for piece in self.pieces)

    def is_even(self) -> bool:
        """Whether all stamps lie on an even grid to within the printed digits."""
        step = self.mean_step
        if not (self.steps.even and step > 0):
            return False
        if self.steps.coarse and self.longest < _LEAST_DIGITS * self.steps.resolution:
            return False
        largest = max(max(abs(p.first_t), abs(p.last_t)) for p in self.pieces)
        near = max(1.05 * self.steps.resolution, _SLACK * step) + 8 * math.ulp(largest)
        return all(
            piece.sag <= near
            and all(
                abs(t - piece.first_t - (row - piece.first) * step) <= near
                for chord in piece.chords
                for row, t in (chord[:2], chord[2:])
            )
            for piece in self.pieces
        )
