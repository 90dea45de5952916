"""Samples as they lie in a file: mapped a window at a time, so that memory stays flat."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from typing import Any

import numpy as np

from benchtool.errors import MalformedCaptureError
from benchtool.formats.content import Content
from benchtool.formats.magnitudes import bounded
from benchtool.frozen import frozen_record
from benchtool.model.arrays import AnyArray, NDArray
from benchtool.model.capture import BLOCK, BLOCK_BYTES, Samples

_WINDOW = 1 << 24

Decode = Callable[[NDArray[Any]], NDArray[Any]]


def as_they_are(rows: NDArray[Any]) -> NDArray[Any]:
    """Return stored numbers in this machine's byte order, side by side."""
    if rows.dtype.kind == "b":
        rows = rows.view(np.uint8) != 0
    return bounded(np.require(rows, _native(rows.dtype), ["C", "A"]))


def _native(stored: np.dtype[Any]) -> np.dtype[Any]:
    native = stored.newbyteorder("=")
    return np.dtype(np.float64) if native.kind == "f" and native.itemsize > 8 else native


@frozen_record(eq=False)
class StoredSamples:
    """A row of samples in a file, one every so many bytes.

    Attributes:
        content: The file.
        offset: Byte of the first sample.
        stored: Type of a sample in the file.
        stride: Bytes from one sample to the next.
        size: Number of samples.
        decode: Makes samples of what is stored.
    """

    content: Content
    offset: int
    stored: np.dtype[Any]
    stride: int
    size: int
    decode: Decode = as_they_are

    @property
    def dtype(self) -> np.dtype[np.generic]:
        """Type of a sample."""
        return self.decode(np.empty(0, self.stored)).dtype

    def blocks(self, start: int = 0, stop: int | None = None) -> Iterator[AnyArray]:
        """Yield consecutive pieces of the samples ``start`` to ``stop``."""
        end = self.size if stop is None else min(stop, self.size)
        length = max(BLOCK, BLOCK_BYTES // self.stored.itemsize)
        window = length * max(1, _WINDOW // (length * self.stride))
        for first in range(start, end, window):
            rows = self._rows(first, min(first + window, end))
            for at in range(0, rows.size, length):
                yield self.decode(rows[at : at + length])

    def _rows(self, first: int, stop: int) -> NDArray[Any]:
        """Map the samples from ``first`` to ``stop``."""
        shape, strides = (stop - first,), (self.stride,)
        begin = self.offset + first * self.stride
        if self.content.path is None:
            data = self.content.data or b""
            return np.ndarray(shape, self.stored, data, begin, strides)
        import mmap

        page = begin - begin % mmap.ALLOCATIONGRANULARITY
        n_bytes = (stop - first - 1) * self.stride + self.stored.itemsize
        try:
            with self.content.open() as file:
                mapped = mmap.mmap(
                    file.fileno(), begin - page + n_bytes, access=mmap.ACCESS_READ, offset=page
                )
        except ValueError as error:
            raise MalformedCaptureError(
                f"{self.content.source} became shorter while it was read",
                hint="Read it when nothing writes to it any more.",
                path=self.content.source,
            ) from error
        return np.ndarray(shape, self.stored, mapped, begin - page, strides)


@frozen_record(eq=False)
class DerivedSamples:
    """Samples made of others, block by block."""

    base: Samples
    derive: Decode

    @property
    def size(self) -> int:
        """Number of samples."""
        return self.base.size

    @property
    def dtype(self) -> np.dtype[np.generic]:
        """Type of a sample."""
        return self.derive(np.empty(0, self.base.dtype)).dtype

    def blocks(self, start: int = 0, stop: int | None = None) -> Iterator[AnyArray]:
        """Yield consecutive pieces of the samples ``start`` to ``stop``."""
        return (self.derive(block) for block in self.base.blocks(start, stop))


@frozen_record(eq=False)
class ThinnedSamples:
    """Samples without some of their rows.

    Attributes:
        base: All samples.
        dropped: Rows that are left out, in order.
    """

    base: Samples
    dropped: NDArray[np.int64]

    @property
    def size(self) -> int:
        """Number of samples."""
        return self.base.size - int(self.dropped.size)

    @property
    def dtype(self) -> np.dtype[np.generic]:
        """Type of a sample."""
        return self.base.dtype

    def blocks(self, start: int = 0, stop: int | None = None) -> Iterator[AnyArray]:
        """Yield consecutive pieces of the samples ``start`` to ``stop``."""
        end = self.size if stop is None else min(stop, self.size)
        if start >= end:
            return
        at, last = self._row(start), self._row(end - 1) + 1
        for block in self.base.blocks(at, last):
            inside = slice(*np.searchsorted(self.dropped, [at, at + block.size]))
            kept = np.delete(block, self.dropped[inside] - at)
            at += block.size
            if kept.size:
                yield kept

    def _row(self, sample: int) -> int:
        """Return which row of all a sample is."""
        before = self.dropped - np.arange(self.dropped.size)
        return sample + int(np.searchsorted(before, sample, side="right"))


def thinned(samples: Samples, dropped: NDArray[np.int64]) -> Samples:
    """Return samples without some of their rows; themselves where there are none."""
    return ThinnedSamples(base=samples, dropped=np.sort(dropped)) if dropped.size else samples
