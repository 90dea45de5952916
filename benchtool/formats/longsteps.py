"""Steps of two digits among steps of one: rounding of an odd interval, or rows that are lost.

Stamps of 1 s that follow one another at 1, 1, 2, 1 s come from rows 1.25 s apart, or from a lost
row. Rounding spreads the long steps as evenly as whole numbers can be: all stamps then lie within
a strip one digit high around a straight line. Rows that are lost fall anywhere.

References:
    A set of whole numbers is a rounded straight line if and only if it fits into such a strip:
    R. Klette, A. Rosenfeld, "Digital straightness - a review", Discrete Applied Mathematics 139
    (2004), section 2.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field

import numpy as np

from benchtool.model.arrays import BoolArray, FloatArray, IntArray

LONG = 1.5
"""Of the typical step: longer ones may be a row lost."""

_WHOLE = 0.01  # of a step: so near to whole steps all must be
_MOST_SHARE = 0.2  # of all rows: with more long steps the short ones are not the rule
_MOST_NOTED = 100_000  # long steps; lost rows so many never lie near a straight line
_EXACT = 1e-6  # digits: noise of the binary digits of stamps
_JITTERS = 0.2  # digits by which the clock of a logger may move a stamp besides rounding
_FEW = 5  # long steps: fewer lie evenly by chance where they may be a little off
_ANY = 2  # long steps: so many lie evenly by chance in a third of the cases


@dataclass(slots=True)
class LongSteps:
    """Notes the long steps of stamps whose step is about one digit.

    Attributes:
        digit: The typical step.
        whole: Whether all steps so far are whole multiples of it.
        n: Long steps noted.
    """

    digit: float
    whole: bool = True
    n: int = 0
    _rows: list[IntArray] = field(default_factory=list)
    _before: list[FloatArray] = field(default_factory=list)
    _after: list[FloatArray] = field(default_factory=list)

    @property
    def plain(self) -> tuple[float, float]:
        """Limits of steps of which nothing needs to be noted."""
        off = _WHOLE if self.whole else LONG - 1
        return (1 - off) * self.digit if self.whole else 0.0, (1 + off) * self.digit

    def note(self, steps: FloatArray, stamps: FloatArray, row: int, counts: BoolArray) -> None:
        """Take the next stamps.

        Args:
            steps: The step before each stamp.
            stamps: The stamps.
            row: Row of the first, over the rows kept.
            counts: Which steps lie inside a piece.
        """
        if not self.whole:
            return
        times = steps[counts] / self.digit
        if not (np.abs(times - np.maximum(np.rint(times), 1)) <= _WHOLE).all():
            self.whole = False
            return
        long = np.flatnonzero(counts & (steps >= LONG * self.digit))
        self._rows.append(long + row)
        self._before.append(stamps[long] - steps[long])
        self._after.append(stamps[long])
        self.n += long.size
        self.whole = self.n <= _MOST_NOTED

    def of(self, first: int, stop: int) -> tuple[IntArray, FloatArray, FloatArray]:
        """Return the rows after a long step between two rows, the stamps before and at each."""
        rows = np.concatenate([np.empty(0, np.int64), *self._rows])
        low, high = np.searchsorted(rows, [first, stop])
        before, after = (np.concatenate([np.empty(0), *s]) for s in (self._before, self._after))
        return rows[low:high], before[low:high], after[low:high]

    def may_be_lost_rows(self, n_rows: int) -> bool:
        """Say whether there are long steps, and few enough to be exceptions."""
        return self.whole and 0 < self.n <= _MOST_SHARE * n_rows

    def are_spread_evenly(self, ends: Iterable[tuple[int, float, int, float]]) -> bool:
        """Say whether the long steps of each piece lie where rounding puts them.

        Args:
            ends: First row and stamp, last row and stamp of each piece.
        """
        may_be_off = _EXACT if self.n < _FEW else _JITTERS
        return all(self._height(*piece) <= 1 + may_be_off for piece in ends)

    def tell_little(self, ends: Iterable[tuple[int, float, int, float]]) -> bool:
        """Say whether the long steps are too few for their places to tell anything."""
        return all(self.of(first, last + 1)[0].size <= _ANY for first, _, last, _ in ends)

    def _height(self, first: int, first_t: float, last: int, last_t: float) -> float:
        """Return the height of the lowest strip around a straight line that holds all stamps."""
        rows, before, after = self.of(first, last + 1)
        x = np.concatenate([[first], rows - 1, rows, [last]]) - first
        y = (np.concatenate([[first_t], before, after, [last_t]]) - first_t) / self.digit
        low, high = 0.0, 2.0
        height = np.inf
        for _ in range(64):  # the height is convex in the slope, and falls towards its least
            slope = (low + high) / 2
            off = y - slope * x
            top, bottom = int(off.argmax()), int(off.argmin())
            height = min(height, float(off[top] - off[bottom]))
            if x[top] == x[bottom]:
                break
            low, high = (slope, high) if x[top] > x[bottom] else (low, slope)
        return height
