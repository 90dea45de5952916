"""Envelopes: two samples a time stamp, the least and the greatest of an interval."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import zip_longest

import numpy as np

from benchtool.formats.clock import ClockScan
from benchtool.frozen import frozen_record
from benchtool.model.arrays import AnyArray, FloatArray, NDArray
from benchtool.model.capture import Samples
from benchtool.model.quantity import Notice

_LEAST_ROWS = 8


def without_twins(stamps: FloatArray) -> FloatArray:
    """Return the first stamps with one of each two that are the same, where all come in twos."""
    told = stamps[np.isfinite(stamps)]
    told = told[: told.size // 2 * 2]
    twins = told.size >= _LEAST_ROWS and bool(np.all(told[::2] == told[1::2]))
    return told[::2] if twins and bool(np.all(np.diff(told[::2]) > 0)) else stamps


def is_envelope(clocks: tuple[ClockScan, ...], n_rows: int) -> bool:
    """Say whether every stamp of a scanned column stands in two rows, one after the other."""
    if len(clocks) != 1 or n_rows < _LEAST_ROWS or not clocks[0].n_repeated:
        return False
    return bool(np.array_equal(clocks[0].dropped, np.arange(1, n_rows, 2)))


def first_rows(n_rows: int) -> NDArray[np.int64]:
    """Return the rows that hold the first sample of each stamp."""
    return np.arange(0, n_rows, 2)


def envelope_notice(n_stamps: int) -> Notice:
    """Return the notice of an envelope."""
    return Notice(
        code="envelope",
        text=f"each of {n_stamps} time stamps has two samples, the ends of an envelope: their "
        "middle was taken, so an edge is known to one step and a glitch may be missed",
    )


@frozen_record(eq=False)
class MiddleSamples:
    """The middle of two rows of samples of one length."""

    first: Samples
    second: Samples

    @property
    def size(self) -> int:
        """Number of samples."""
        return min(self.first.size, self.second.size)

    @property
    def dtype(self) -> np.dtype[np.generic]:
        """Type of a sample."""
        return np.dtype(np.float64)

    def blocks(self, start: int = 0, stop: int | None = None) -> Iterator[AnyArray]:
        """Yield consecutive pieces of the samples ``start`` to ``stop``."""
        end = self.size if stop is None else min(stop, self.size)
        a: AnyArray = np.empty(0)
        b: AnyArray = np.empty(0)
        empty: AnyArray = np.empty(0)
        pieces = zip_longest(
            self.first.blocks(start, end), self.second.blocks(start, end), fillvalue=empty
        )
        for one, other in pieces:
            a, b = np.concatenate([a, one]), np.concatenate([b, other])
            size = min(a.size, b.size)
            if size:
                yield np.add(a[:size], b[:size], dtype=np.float64) / 2
            a, b = a[size:], b[size:]
