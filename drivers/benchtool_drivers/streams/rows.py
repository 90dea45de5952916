"""Rows of numbers from lines of text."""

from __future__ import annotations

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, NDArray

IntArray = NDArray[np.int64]
ByteArray = NDArray[np.uint8]

MOST_DIGITS = 18


@frozen_record(eq=False)
class Rows:
    """What whole lines gave, in their order.

    Attributes:
        seq: Sequence numbers as printed; empty where there are none.
        ticks: Times (or lengths) as printed, in ticks.
        codes: Bit 0 the level, bit 1 set for a heartbeat; -1 where lines give no level.
        broken: Whether lines that could not be read stood right before this one.
        restarts: Whether a start mark stood right before this one.
        broken_after: Whether lines that could not be read stood behind the last row.
        restarts_after: Whether a start mark stood behind the last row.
        numbers: Number of each line since the stream was opened.
        decimals: Most decimal digits that a time was printed with.
        garbage: Number and text of the lines that could not be read.
        comments: Number and text of the lines that are comments.
        n_lines: Lines in all.
    """

    seq: IntArray
    ticks: IntArray
    codes: NDArray[np.int8]
    broken: BoolArray
    restarts: BoolArray
    numbers: IntArray
    broken_after: bool = False
    restarts_after: bool = False
    decimals: int = 0
    garbage: tuple[tuple[int, bytes], ...] = ()
    comments: tuple[tuple[int, bytes], ...] = ()
    n_lines: int = 0
