"""What is kept of a value change dump: the changes of each wanted variable."""

from __future__ import annotations

from array import array
from dataclasses import dataclass, field
from typing import Any, Generic, TypeVar

import numpy as np

from benchtool.model.arrays import IntArray, NDArray

BIT_STATES = {48: 0, 49: 1, 120: -1, 88: -1, 122: -1, 90: -1,
              104: 1, 72: 1, 108: 0, 76: 0, 117: -1, 85: -1, 119: -1, 87: -1, 45: -1}  # fmt: skip
"""State of each character: 0 1 x z (IEEE 1364-2005, 18.2.1); h l u w - (IEEE 1164, 4.2)."""


_SMALL = 256
_Row = TypeVar("_Row", np.int8, np.float64)


class _Pieces(Generic[_Row]):
    """Times, counted from the first, and what was taken on at each; in pieces."""

    dtype: type[_Row]
    letter: str
    __slots__ = ("_added", "_pieces", "_times")

    def __init__(self) -> None:
        self._pieces: list[tuple[IntArray, NDArray[_Row]]] = []
        self._times: array[int] = array("q")
        self._added: array[Any] = array(self.letter)

    def add(self, time: int, value: float) -> None:
        """Append one change."""
        self._times.append(time)
        self._added.append(value)

    def extend(self, times: IntArray, values: NDArray[_Row]) -> None:
        """Append changes in order of time."""
        if times.size < _SMALL:  # the shell of a small array is larger than what it holds
            self._times.frombytes(times.tobytes())
            self._added.frombytes(values.tobytes())
            return
        self._close()
        self._pieces.append((times, values))

    def hand_over(self) -> list[tuple[IntArray, NDArray[_Row]]]:
        """Return all changes in pieces, the last first, to be popped; none are kept here."""
        self._close()
        pieces, self._pieces = self._pieces[::-1], []
        return pieces

    def _close(self) -> None:
        if len(self._times):
            times = np.frombuffer(self._times, np.int64)
            self._pieces.append((times, np.frombuffer(self._added, self.dtype)))
            self._times, self._added = array("q"), array(self.letter)


class Changes(_Pieces[np.int8]):
    """The changes of one bit: 1, 0 or -1 for unknown."""

    dtype, letter = np.int8, "b"
    __slots__ = ()

    def extend(self, times: IntArray, values: NDArray[np.int8]) -> None:
        """Append changes in order of time, without those that change nothing.

        Args:
            times: Counts, each once.
            values: States.
        """
        new = np.ones(values.size, bool)
        np.not_equal(values[1:], values[:-1], out=new[1:])
        if not new.all():
            times, values = times[new], values[new]
        super().extend(times, values)


class NumberChanges(_Pieces[np.float64]):
    """The changes of one real, or of a vector taken as a number; NaN for unknown."""

    dtype, letter = np.float64, "d"
    __slots__ = ()


@dataclass(slots=True)
class Body:
    """All changes of the wanted variables.

    Attributes:
        source: Name of the file.
        known: Codes of all declared variables.
        bits: Code to the changes of each bit, most significant first.
        reals: Code to the changes of a real.
        numbers: Code to the changes of a vector that is wanted as a number.
        start: First time of the dump as the file counts it, None before it is met.
        time: The time last met, counted from the first.
        cut: The words that a cut file ends in, if it does.
    """

    source: str
    known: frozenset[bytes]
    bits: dict[bytes, list[Changes]] = field(default_factory=dict)
    reals: dict[bytes, NumberChanges] = field(default_factory=dict)
    numbers: dict[bytes, NumberChanges] = field(default_factory=dict)
    start: int | None = None
    time: int = 0
    cut: str = ""


def extended(digits: str, width: int) -> str:
    """Return a vector value in full width, longer where it has more digits.

    References:
        IEEE 1364-2005, table 18-1: a shorter value is extended on the left with 0 where it
        begins with 0 or 1, else with its first digit.
    """
    digits = digits.lower()
    fill = digits[:1] if digits[:1] in ("x", "z") else "0"
    return digits.rjust(width, fill)
