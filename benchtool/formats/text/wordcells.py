"""Words of logic: cells such as ``0x3F``, ``3Fh`` or ``00111111`` that hold several channels."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from benchtool.formats.text import words
from benchtool.model.arrays import FloatArray

_MOST_BITS = 32
_NAMES = frozenset(
    [
        "bus",
        "port",
        "pins",
        "pin",
        "channels",
        "ch",
        "logic",
        "state",
        "states",
        "bits",
        "bit",
        "word",
        "gpio",
        "probe",
        "probes",
        "digital",
        "pod",
        "levels",
        "level",
        "inputs",
        "io",
        "dio",
        "lines",
    ]
)


def names_bits(name: str) -> bool:
    """Say whether a column of words is named for lines of logic and not for decoded data."""
    told = words.normal(name).replace(".", " ").replace(":", " ").split()
    return not told or any(
        word in _NAMES or (word[0] in "dab" and word[1:].isdigit()) or _is_port(word)
        for word in told
    )


def _is_port(word: str) -> bool:
    return word.startswith("port") and len(word) <= 5


def is_bit_row(cells: Sequence[str]) -> bool:
    """Say whether plain cells of one length, of 0 and 1 alone, some led by 0, are words of bits."""
    told = [cell for cell in cells if cell]
    alike = len({len(cell) for cell in told}) == 1 and len(told[0]) > 1
    led = any(cell[0] == "0" for cell in told)
    return bool(told) and alike and led and all(set(cell) <= {"0", "1"} for cell in told)


def n_bits(cells: Sequence[str]) -> int:
    """Return how many lines the words of a column hold."""
    longest = max(cells, key=len)
    text, base = _digits(longest)
    return min(_MOST_BITS, len(text) * (4 if base == 16 else 1))


def _digits(cell: str) -> tuple[str, int]:
    """Return the digits of a word and their base."""
    text = cell.lower()
    if text.startswith(("0x", "0b")):
        return text[2:], 16 if text[1] == "x" else 2
    if text.endswith("h"):
        return text[:-1], 16
    return text.removesuffix("b"), 2


def bit_of(bit: int) -> Callable[[Sequence[str]], FloatArray]:
    """Return a converter of words to the states of one of their bits, NaN where no word is."""

    def convert(cells: Sequence[str]) -> FloatArray:
        return np.array([_bit(cell, bit) for cell in cells])

    return convert


def _bit(cell: str, bit: int) -> float:
    text, base = _digits(cell.strip().strip('"'))
    try:
        return float(int(text, base) >> bit & 1)
    except ValueError:
        return float("nan")
