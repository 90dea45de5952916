"""The words of a block of value changes: where each begins and what kind it is."""

from __future__ import annotations

import numpy as np

from benchtool.formats.vcd.changes import BIT_STATES
from benchtool.frozen import frozen_record
from benchtool.model.arrays import IntArray, NDArray

PAD = b"\n" * 64
"""Stands before a block, so that windows that end in its words stay inside."""
TAIL = b"x" * 8
"""Stands behind a block, for windows that begin there: a word without an end, which is left."""

Bytes = NDArray[np.uint8]

TIME, SCALAR, CODE = 1, 2, 3
_VALUE, _KEYWORD = 4, 5
_SILENT = frozenset({b"$end", b"$dumpon", b"$dumpall", b"$dumpvars"})
_MOST_KEYWORDS = 4096
_KINDS = np.zeros(256, np.uint8)
_KINDS[list(BIT_STATES)] = SCALAR
_KINDS[list(b"bBrRsS")] = _VALUE
_KINDS[ord("#")], _KINDS[ord("$")] = TIME, _KEYWORD


@frozen_record(eq=False)
class Words:
    """The words of a block.

    Attributes:
        buffer: Its bytes, padded.
        starts: Where each word begins.
        stops: One past where it ends.
        kinds: What each is.
    """

    buffer: Bytes
    starts: IntArray
    stops: IntArray
    kinds: Bytes


def split_words(data: bytes) -> Words:
    """Find the words of a block that stands between ``PAD`` and ``TAIL``.

    ``starts`` has one more, the word without an end.
    """
    buffer = np.frombuffer(data, np.uint8)
    space = (buffer - np.uint8(9) < 5) | (buffer == 32)
    turns = np.flatnonzero(space[1:] != space[:-1])
    turns += 1
    starts, stops = turns[::2], turns[1::2]
    return Words(buffer=buffer, starts=starts, stops=stops, kinds=_KINDS[buffer[starts[:-1]]])


def first_words(words: Words, n_words: int) -> Words:
    """Return the first words of a block."""
    return Words(
        buffer=words.buffer,
        starts=words.starts[:n_words],
        stops=words.stops[:n_words],
        kinds=words.kinds[:n_words],
    )


def find_values(kinds: Bytes) -> IntArray:
    """Return which words are values with their code in the word after.

    A code may look like a value. Of words in a row that do, the first is a value, as no value
    stands before it, the second its code, and so on by turns.
    """
    alike = np.flatnonzero(kinds == _VALUE)
    if alike.size == 0:
        return alike
    begins = np.append(True, np.diff(alike) != 1)
    first = np.maximum.accumulate(np.where(begins, alike, 0))
    values: IntArray = alike[(alike - first) % 2 == 0]
    return values


def only_silent(words: Words) -> bool:
    """Whether all words are of a known kind, and all keywords such as change nothing."""
    if words.kinds.size and not words.kinds.all():
        return False
    at = np.flatnonzero(words.kinds == _KEYWORD)
    if at.size > _MOST_KEYWORDS:
        return False
    spans = zip(words.starts[at].tolist(), words.stops[at].tolist(), strict=True)
    return all(words.buffer[a:b].tobytes() in _SILENT for a, b in spans)
