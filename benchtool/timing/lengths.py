"""How many samples lie on a transition."""

from __future__ import annotations

import numpy as np

from benchtool.model.arrays import middle
from benchtool.timing.pieces import Codes, Index
from benchtool.timing.thresholds import Thresholds

_SAMPLED = 48  # edges of each direction whose length is looked at


class TransitionLengths:
    """How many samples lie strictly between the reference levels, from a few transitions."""

    def __init__(self) -> None:
        self._found: dict[bool, list[int]] = {True: [], False: []}

    def look(self, values: Codes, at: Index, limits: Thresholds) -> None:
        """Measure transitions of the piece until each direction has enough."""
        for position in at[: 4 * _SAMPLED]:
            if position == 0 or min(len(x) for x in self._found.values()) >= _SAMPLED:
                continue
            rising = bool(values[position] >= limits.mid)
            if len(self._found[rising]) < _SAMPLED:
                length = _length(values, int(position), limits, rising=rising)
                if length is not None:
                    self._found[rising].append(length)

    def typical(self) -> tuple[float, float]:
        """Return the usual length of rising and falling transitions."""
        return _usual(self._found[True]), _usual(self._found[False])


def _usual(lengths: list[int]) -> float:
    """Return the mean of the lengths, those of disturbed transitions left out."""
    if not lengths:
        return 0.0
    found = np.array(lengths)
    return float(np.mean(found[found <= 3 * middle(found) + 2]))


def _length(values: Codes, position: int, limits: Thresholds, *, rising: bool) -> int | None:
    """Count samples strictly between the reference levels around a crossing, None if cut."""
    reach = 8
    while True:
        ahead, behind = (
            values[position : position + reach],
            values[max(0, position - reach) : position],
        )
        past = ahead >= limits.upper if rising else ahead <= limits.lower
        ahead_at = np.flatnonzero(past)
        from_ = behind <= limits.lower if rising else behind >= limits.upper
        behind_at = np.flatnonzero(from_)
        if ahead_at.size and behind_at.size:
            return int(ahead_at[0] + behind.size - 1 - behind_at[-1])
        if position + reach >= values.size or position - reach <= 0:
            return None
        reach *= 4
