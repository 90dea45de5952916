"""What turns the cells of a channel into numbers, where they are no plain ones."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from benchtool.formats.text.cells import HIGH_WORDS, LOW_WORDS
from benchtool.formats.text.column import Column
from benchtool.formats.text.decoding import Convert
from benchtool.formats.text.labels import codes_of
from benchtool.model.arrays import FloatArray


def converter(column: Column) -> Convert | None:
    """Return what turns the cells of a channel into numbers; None where they are plain ones."""
    if column.bit is not None:
        from benchtool.formats.text.wordcells import bit_of

        return bit_of(column.bit)
    if column.kind == "L":
        return codes_of
    return states if column.kind == "W" else None


def states(cells: Sequence[str]) -> FloatArray:
    """Return 1 for words of high, 0 for words of low, NaN for all else."""
    return np.array([_state(cell.lower()) for cell in cells])


def _state(word: str) -> float:
    if word in HIGH_WORDS:
        return 1.0
    return 0.0 if word in LOW_WORDS else float("nan")
