"""From the identifier codes in a block to the numbers of their variables."""

from __future__ import annotations

import numpy as np

from benchtool.formats.vcd.changes import Body, Changes
from benchtool.formats.vcd.digits import words_at
from benchtool.model.arrays import IntArray, NDArray

UNKNOWN, OTHER = -2, -1
"""Stand for a code that is not declared, and for one that is not wanted."""

_LONGEST = 8
_SHORT = 2
_MOST = 2**15 - 1

Numbers = NDArray[np.int16]


class CodeTable:
    """Numbers the wanted variables of a dump and finds them by their codes."""

    def __init__(self, body: Body) -> None:
        self._codes = [*body.bits, *(code for code in body.reals if code not in body.bits)]
        self._bits = body.bits
        longest = max(map(len, body.known), default=0)
        self.usable = 0 < longest <= _LONGEST and len(body.known) <= _MOST
        self.only: Changes | None = None
        if not self.usable:
            return
        self._longest = longest
        first = self._bits.get(self._codes[0]) if self._codes else None
        self.only = first[0] if first is not None and len(first) == 1 else None
        numbers = dict.fromkeys(body.known, OTHER) | {c: i for i, c in enumerate(self._codes)}
        if longest <= _SHORT:
            self._direct = np.full(256**longest, UNKNOWN, np.int16)
            self._direct[[int.from_bytes(c, "little") for c in numbers]] = list(numbers.values())
        else:
            packed = np.array([int.from_bytes(c, "little") for c in numbers], np.uint64)
            order = np.argsort(packed)
            self._packed = packed[order]
            self._numbers = np.array(list(numbers.values()), np.int16)[order]

    def bits_of(self, variable: int) -> list[Changes] | None:
        """Return the bits of a variable, None where it has none that are wanted."""
        return self._bits.get(self._codes[variable]) if variable >= 0 else None

    def code_of(self, variable: int) -> bytes:
        """Return the code of a variable; empty where it is not wanted."""
        return self._codes[variable] if variable >= 0 else b""

    def find(self, buffer: NDArray[np.uint8], starts: IntArray, stops: IntArray) -> Numbers | None:
        """Return the number of the variable of each code; None where a code is too long or empty.

        Args:
            buffer: Bytes with room behind the last code.
            starts: Where each code begins.
            stops: One past where it ends.
        """
        lengths = stops - starts
        if lengths.size and not 1 <= lengths.min() <= lengths.max() <= self._longest:
            return None
        if self._longest == 1:
            return self._direct[buffer[starts]]
        if self._longest == _SHORT:
            keys = buffer[starts].astype(np.uint16)
            keys |= np.where(lengths == _SHORT, buffer[starts + 1], 0).astype(np.uint16) << 8
            return self._direct[keys]
        packed = words_at(buffer, starts) & _masks(lengths)
        at = np.minimum(np.searchsorted(self._packed, packed), self._packed.size - 1)
        return np.where(self._packed[at] == packed, self._numbers[at], np.int16(UNKNOWN))


def _masks(lengths: IntArray) -> NDArray[np.uint64]:
    """Return the mask that keeps the first bytes of a word of eight."""
    return np.uint64(2**64 - 1) >> ((_LONGEST - lengths) * 8).astype(np.uint64)
