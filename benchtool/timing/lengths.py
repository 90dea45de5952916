"""How many samples lie on a transition."""

from __future__ import annotations

import numpy as np

from benchtool.model.arrays import BoolArray, middle
from benchtool.timing.pieces import Index
from benchtool.timing.rows import Codes
from benchtool.timing.thresholds import Thresholds

_SAMPLED = 48  # edges of each direction whose length is looked at
_NEAR, _WIDER = 16, 4  # samples looked at first on each side, and how many times more after that


class TransitionLengths:
    """How many samples lie strictly between the reference levels, from a few transitions."""

    def __init__(self) -> None:
        self._found: dict[bool, list[int]] = {True: [], False: []}

    def look(self, values: Codes, at: Index, limits: Thresholds) -> None:
        """Measure transitions of a piece until each direction has enough.

        Args:
            values: Samples of the piece.
            at: Positions in them of one crossing a transition.
            limits: Reference levels.
        """
        if min(len(found) for found in self._found.values()) >= _SAMPLED:
            return
        first = at[: 4 * _SAMPLED]
        first = first[first > 0]
        rising = values[first] >= limits.is_above
        for direction, found in self._found.items():
            chosen = first[rising == direction][: _SAMPLED - len(found)]
            found.extend(_lengths(values, chosen, limits, rising=direction))

    def typical(self) -> tuple[float, float]:
        """Return the usual length of rising and falling transitions."""
        return _usual(self._found[True]), _usual(self._found[False])


def _usual(lengths: list[int]) -> float:
    """Return the mean of the lengths, those of disturbed transitions left out."""
    if not lengths:
        return 0.0
    found = np.array(lengths)
    return float(np.mean(found[found <= 3 * middle(found) + 2]))


def _lengths(values: Codes, at: Index, limits: Thresholds, *, rising: bool) -> list[int]:
    """Count samples strictly between the reference levels around crossings, the cut left out."""
    steps = np.arange(_NEAR)
    ahead = values[np.minimum(at[:, None] + steps, values.size - 1)]
    behind = values[np.maximum(at[:, None] - 1 - steps, 0)]
    past, left = _beyond(ahead, limits, above=rising), _beyond(behind, limits, above=not rising)
    found = past.any(axis=1) & left.any(axis=1)
    near = (past.argmax(axis=1) + left.argmax(axis=1))[found].tolist()
    far = (_far_length(values, int(position), limits, rising=rising) for position in at[~found])
    return [*near, *(length for length in far if length is not None)]


def _far_length(values: Codes, at: int, limits: Thresholds, *, rising: bool) -> int | None:
    """Count the samples of a longer transition, None where the piece cuts it."""
    reach = _NEAR
    while at + reach < values.size and at > reach:
        reach *= _WIDER
        past = _beyond(values[at : at + reach], limits, above=rising)
        left = _beyond(values[max(0, at - reach) : at], limits, above=not rising)[::-1]
        if past.any() and left.any():
            return int(past.argmax() + left.argmax())
    return None


def _beyond(values: Codes, limits: Thresholds, *, above: bool) -> BoolArray:
    beyond: BoolArray = values >= limits.rests_above if above else values <= limits.rests_below
    return beyond
