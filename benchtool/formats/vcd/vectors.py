"""Values of vectors, many at a time (IEEE 1364-2005, table 18-1)."""

from __future__ import annotations

import numpy as np

from benchtool.formats.vcd.changes import BIT_STATES
from benchtool.formats.vcd.digits import ZEROS, digit_mask, words_at
from benchtool.model.arrays import FloatArray, IntArray, NDArray

_INVALID = 2
_NOT_BITS = np.uint64(0xFEFEFEFEFEFEFEFE)
STATES = np.full(256, _INVALID, np.int8)
"""State of each character."""
STATES[list(BIT_STATES)] = list(BIT_STATES.values())
_FILLS = np.full(256, ord("0"), np.uint8)
_FILLS[list(b"xXzZ")] = list(b"xXzZ")


def vector_states(
    buffer: NDArray[np.uint8], starts: IntArray, stops: IntArray, width: int
) -> NDArray[np.int8] | None:
    """Return the states of each bit, shape (width, values), most significant first.

    None where a value has no digit, too many, or one that is no state.
    """
    lengths = stops - starts
    if lengths.min() < 1 or lengths.max() > width:
        return None
    binary = _binary_states(buffer, stops, lengths, width)
    if binary is not None:
        return binary
    states = np.empty((width, lengths.size), np.int8)
    fills = _FILLS[buffer[starts]]
    for place in range(width):
        digits = np.where(lengths > place, buffer[stops - (place + 1)], fills)
        states[width - 1 - place] = STATES[digits]
    return None if (states == _INVALID).any() else states


def _binary_states(
    buffer: NDArray[np.uint8], stops: IntArray, lengths: IntArray, width: int
) -> NDArray[np.int8] | None:
    """Return the states of values that hold nothing but 0 and 1, eight bits at a time."""
    states = np.empty((width, lengths.size), np.int8)
    for done in range(0, width, 8):
        eights = (words_at(buffer, stops - 8 - done) ^ ZEROS) & digit_mask(lengths, done)
        if np.bitwise_or.reduce(eights) & _NOT_BITS:
            return None
        n_bits = min(8, width - done)
        states[width - done - n_bits : width - done] = (
            eights.view(np.int8).reshape(-1, 8).T[-n_bits:]
        )
    return states


def number_of(states: NDArray[np.int8]) -> FloatArray:
    """Return the numbers that bits make, NaN where one is unknown."""
    weights = 2.0 ** np.arange(states.shape[0] - 1, -1, -1)
    values = weights @ np.maximum(states, 0)
    values[(states < 0).any(axis=0)] = np.nan
    return values
