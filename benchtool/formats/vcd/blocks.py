"""Value changes a block at a time, by whole-array arithmetic on its bytes.

Nothing is decided here: a block that holds anything but times in order, changes of declared
variables and the silent keywords is left untouched, for the walk word by word to take.
"""

from __future__ import annotations

from itertools import pairwise

import numpy as np

from benchtool.formats.vcd.changes import Body, Changes
from benchtool.formats.vcd.codes import OTHER, UNKNOWN, CodeTable
from benchtool.formats.vcd.digits import counts_of
from benchtool.formats.vcd.splitting import (
    CODE,
    PAD,
    SCALAR,
    TIME,
    Bytes,
    Words,
    find_values,
    first_words,
    only_silent,
    split_words,
)
from benchtool.formats.vcd.vectors import STATES, number_of, vector_states
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, IntArray, NDArray


@frozen_record(eq=False)
class _Found:
    """What the words of a block were found to say; nothing is kept before all of it is sound."""

    start: int
    times: IntArray
    bits: list[tuple[Changes, IntArray, NDArray[np.int8]]]
    numbers: list[tuple[bytes, IntArray, FloatArray]]


class BlockWalk:
    """Takes whole blocks of the body, in order, into a ``Body``."""

    def __init__(self, body: Body) -> None:
        self.body = body
        self._table = CodeTable(body)

    def take(self, data: bytes) -> int | None:
        """Take a block; return how many of its bytes were taken, None where none were.

        Args:
            data: A block between ``PAD`` and ``TAIL``.
        """
        if not self._table.usable:
            return None
        words = split_words(data)
        n_words = words.kinds.size
        values = find_values(words.kinds)
        if values.size and values[-1] == n_words - 1:  # its code comes with the next block
            values, n_words = values[:-1], n_words - 1
        words.kinds[values + 1] = CODE
        stop = int(words.starts[n_words]) - len(PAD)
        return stop if stop and self._read(first_words(words, n_words), values) else None

    def _read(self, words: Words, values: IntArray) -> bool:
        """Read all words and keep what they say, if all of them are sound."""
        is_time = words.kinds == TIME
        times = self._times(words, is_time)
        if times is None or not only_silent(words):
            return False
        start, relative = times
        at_word = relative[np.cumsum(is_time)]
        found = _Found(start=start, times=relative, bits=[], numbers=[])
        seen = self._read_scalars(words, at_word, found)
        if seen is None or (
            values.size and not self._read_values(words, values, at_word, found, seen)
        ):
            return False
        self._keep(found)
        return True

    def _keep(self, found: _Found) -> None:
        if found.times.size > 1:
            self.body.start, self.body.time = found.start, int(found.times[-1])
        for changes, times, states in found.bits:
            changes.extend(times, states)
        for code, times, values in found.numbers:
            each = self.body.reals.get(code) or self.body.numbers[code]
            each.extend(times, values)

    def _times(self, words: Words, is_time: NDArray[np.bool_]) -> tuple[int, IntArray] | None:
        """Return the first time of the dump, and the times of the block counted from it.

        The time that holds at its beginning stands before them.
        """
        at = np.flatnonzero(is_time)
        counts = counts_of(words.buffer, words.starts[at] + 1, words.stops[at])
        if counts is None:
            return None
        start = self.body.start
        if start is None:
            start = int(counts[0]) if counts.size else 0
        if start >= 2**62:
            return None
        relative = np.empty(counts.size + 1, np.int64)
        relative[0] = self.body.time
        np.subtract(counts, start, out=relative[1:])
        return None if (relative[1:] < relative[:-1]).any() else (start, relative)

    def _read_scalars(self, words: Words, at_word: IntArray, found: _Found) -> set[int] | None:
        """Read all changes of one character; return the variables met, None if one is odd."""
        at = np.flatnonzero(words.kinds == SCALAR)
        if at.size == 0:
            return set()
        starts = words.starts[at]
        which = self._table.find(words.buffer, starts + 1, words.stops[at])
        if which is None:
            return None
        if self._table.only is not None and not which.any():
            states = STATES[words.buffer[starts]]
            found.bits.append((self._table.only, *_last_of_each(at_word[at], states)))
            return {0}
        return self._sort_scalars(at_word[at], STATES[words.buffer[starts]], which, found)

    def _sort_scalars(
        self, times: IntArray, states: NDArray[np.int8], which: NDArray[np.int16], found: _Found
    ) -> set[int] | None:
        """Give every variable its own changes."""
        order = np.argsort(which, kind="stable")
        which = which[order]
        cuts = np.flatnonzero(which[1:] != which[:-1]) + 1
        bounds = [0, *cuts.tolist(), which.size]
        met = set()
        for first, stop in pairwise(bounds):
            variable = int(which[first])
            if variable == OTHER:
                continue
            bits = self._table.bits_of(variable)
            if variable == UNKNOWN or bits is None or len(bits) != 1:
                return None
            mine = order[first:stop]
            found.bits.append((bits[0], *_last_of_each(times[mine], states[mine])))
            met.add(variable)
        return met

    def _read_values(
        self, words: Words, values: IntArray, at_word: IntArray, found: _Found, seen: set[int]
    ) -> bool:
        """Read all vectors and reals; False if one is odd."""
        which = self._table.find(words.buffer, words.starts[values + 1], words.stops[values + 1])
        if which is None:
            return False
        letters = words.buffer[words.starts[values]] | np.uint8(32)
        for place in np.flatnonzero(np.bincount(which - UNKNOWN)).tolist():
            variable = place + UNKNOWN
            mine = which == variable
            if variable == UNKNOWN or variable in seen:
                return False
            for letter in b"br":
                at = values[mine & (letters == letter)]
                if at.size and not self._read_variable(
                    words, at, at_word[at], variable, letter, found
                ):
                    return False
        return True

    def _read_variable(
        self,
        words: Words,
        at: IntArray,
        times: IntArray,
        variable: int,
        letter: int,
        found: _Found,
    ) -> bool:
        """Read the vectors, or the reals, of one variable; False if one is odd."""
        starts, stops = words.starts[at] + 1, words.stops[at]
        if letter == ord("r"):
            return self._read_reals(words.buffer, starts, stops, times, variable, found)
        bits = self._table.bits_of(variable)
        if bits is None:
            return True
        states = vector_states(words.buffer, starts, stops, len(bits))
        if states is None:
            return False
        times, states = _last_of_each(times, states)
        found.bits.extend((bit, times, row) for bit, row in zip(bits, states, strict=True))
        code = self._table.code_of(variable)
        if code in self.body.numbers:
            found.numbers.append((code, times, number_of(states)))
        return True

    def _read_reals(
        self,
        buffer: Bytes,
        starts: IntArray,
        stops: IntArray,
        times: IntArray,
        variable: int,
        found: _Found,
    ) -> bool:
        data = buffer.tobytes()
        try:
            values = [
                float(data[a:b]) for a, b in zip(starts.tolist(), stops.tolist(), strict=True)
            ]
        except ValueError:
            return False
        code = self._table.code_of(variable)
        if code in self.body.reals:
            array = np.array(values)
            array[~np.isfinite(array)] = np.nan
            found.numbers.append((code, times, array))
        return True


def _last_of_each(times: IntArray, states: NDArray[np.int8]) -> tuple[IntArray, NDArray[np.int8]]:
    """Return, of several states at one time, the last."""
    last = times[1:] != times[:-1]
    if last.all():
        return times, states
    last = np.append(last, True)
    return times[last], states[..., last]
