"""Walking the data rows of a text in blocks of whole lines, as often as needed."""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Iterator
from dataclasses import field, replace

import numpy as np

from benchtool.formats.content import Content
from benchtool.formats.text.decoding import Decoded, Decoder
from benchtool.frozen import frozen_record
from benchtool.model.arrays import AnyArray, NDArray

BLOCK_BYTES = 1 << 20


@frozen_record(eq=False)
class DataRows:
    """The bytes of the data rows, and how to decode them.

    Attributes:
        content: The file.
        decoder: Decodes its blocks.
        start: Byte offset of the first row.
        stop: Byte offset where the last whole row ends.
        first_line: Line number of the first row, from 1.
        block_bytes: Size of a block.
    """

    content: Content
    decoder: Decoder
    start: int
    stop: int
    first_line: int
    block_bytes: int = field(default_factory=lambda: BLOCK_BYTES)

    def blocks(self, offset: int | None = None) -> Iterator[tuple[int, bytes]]:
        """Yield blocks of whole lines with their byte offset; the file is open meanwhile."""
        at = self.start if offset is None else offset
        newline = b"\r" if self.decoder.carriage else b"\n"
        rest = b""
        with self.content.open() as file:
            file.seek(at)
            left = self.stop - at
            while left > 0 and (chunk := file.read(min(self.block_bytes, left))):
                left -= len(chunk)
                whole, mark, after = (rest + chunk).rpartition(newline)
                rest = after
                if mark:
                    yield at, whole + mark
                    at += len(whole) + 1
            if rest:
                yield at, rest

    def only(self, place: int) -> DataRows:
        """Return the same rows, decoded for one column alone."""
        return replace(self, decoder=self.decoder.only(place))

    def decoded(self, offset: int | None = None) -> Iterator[tuple[int, Decoded]]:
        """Yield decoded blocks with their byte offset."""
        for at, block in self.blocks(offset):
            yield at, self.decoder.decode(block)


@frozen_record(eq=False)
class BlockIndex:
    """Where blocks begin: row number and byte offset of each."""

    rows: list[int] = field(default_factory=list)
    offsets: list[int] = field(default_factory=list)

    def add(self, row: int, offset: int) -> None:
        """Note the next block."""
        self.rows.append(row)
        self.offsets.append(offset)

    def before(self, row: int) -> tuple[int, int]:
        """Return the start of the block that holds ``row``."""
        i = max(0, bisect_right(self.rows, row) - 1)
        return self.rows[i], self.offsets[i]


@frozen_record(eq=False)
class TextSamples:
    """One column of a text file, decoded anew each time it is walked.

    Attributes:
        source: The data rows, decoded for one column.
        index: Where blocks begin.
        dropped: Rows that take no part, in order.
        n_rows: Rows of the file up to the last that counts.
        dtype: Type of a sample.
        origin: Subtracted from each value.
        times: Factor after that.
        over: Divisor after that.
    """

    source: DataRows
    index: BlockIndex
    dropped: NDArray[np.int64]
    n_rows: int
    dtype: np.dtype[np.generic]
    origin: float = 0.0
    times: float = 1.0
    over: float = 1.0

    @property
    def size(self) -> int:
        """Number of samples."""
        return self.n_rows - int(self.dropped.size)

    def blocks(self, start: int = 0, stop: int | None = None) -> Iterator[AnyArray]:
        """Yield consecutive pieces of the samples ``start`` to ``stop``, re-reading the file."""
        end = self.size if stop is None else min(stop, self.size)
        row, offset = self.index.before(start)
        at = row - int(np.searchsorted(self.dropped, row))
        for _, decoded in self.source.decoded(offset):
            if at >= end:
                return
            values = self._kept(decoded.table[:, 0], row)
            piece = values[max(0, start - at) : end - at]
            row += decoded.table.shape[0]
            at += values.size
            if piece.size:
                yield self._scaled(piece)

    def _kept(self, values: NDArray[np.float64], row: int) -> NDArray[np.float64]:
        values = values[: max(0, self.n_rows - row)]
        first, last = np.searchsorted(self.dropped, [row, row + values.size])
        return np.delete(values, self.dropped[first:last] - row) if last > first else values

    def _scaled(self, values: NDArray[np.float64]) -> AnyArray:
        if self.origin or self.times != 1.0 or self.over != 1.0:
            values = (values - self.origin) * self.times / self.over
        return values.astype(self.dtype, copy=False)
