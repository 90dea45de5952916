"""Walking the data rows of a text in blocks of whole lines, as often as needed."""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Iterator
from dataclasses import field, replace

import numpy as np

from benchtool.formats.content import Content
from benchtool.formats.spool import ColumnSpool
from benchtool.formats.text.decoding import Decoded, Decoder
from benchtool.formats.text.lineends import whole_lines
from benchtool.frozen import frozen_record
from benchtool.model.arrays import AnyArray, NDArray
from benchtool.model.watching import tell

BLOCK_BYTES = 2 << 20
_FREED_BYTES = 16 << 20  # of memory that the C library is taught to keep


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
        size = self.block_bytes
        with self.content.open() as file:
            while at < self.stop:
                file.seek(at)
                wanted = min(size, self.stop - at)
                data = file.read(wanted)
                is_last = at + len(data) == self.stop or len(data) < wanted  # cut meanwhile
                n_whole = len(data) if is_last else whole_lines(data)
                if n_whole:
                    yield at, data if n_whole == len(data) else data[:n_whole]
                    at += n_whole
                if is_last:
                    return
                size = self._next_size(size, n_whole, wanted)

    def _next_size(self, size: int, n_whole: int, read: int) -> int:
        """Return how much to read after ``n_whole`` bytes of whole lines were found in a block.

        Lines of one length then fill the next block to its end, and nothing need be cut off.
        """
        if not n_whole:
            return 2 * size  # a line longer than that
        if n_whole == read:
            return size
        fits = size == self.block_bytes and 2 * n_whole > size
        return n_whole if fits else self.block_bytes

    def only(self, place: int) -> DataRows:
        """Return the same rows, decoded for one column alone."""
        return replace(self, decoder=self.decoder.only(place))

    def decoded(self, offset: int | None = None) -> Iterator[tuple[int, Decoded]]:
        """Yield decoded blocks with their byte offset.

        Of a large file, one large array is made and dropped before: the C library then keeps the
        memory of smaller ones, and does not take it from the system and clear it for each block.
        """
        if self.stop - self.start > 2 * _FREED_BYTES:
            np.empty(_FREED_BYTES, np.uint8)
        for at, block in self.blocks(offset):
            yield at, self.decoder.decode(block)
            tell("reading", at + len(block) - self.start, self.stop - self.start)


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
        i = self.number(row)
        return self.rows[i], self.offsets[i]

    def number(self, row: int) -> int:
        """Return which block holds ``row``."""
        return max(0, bisect_right(self.rows, row) - 1)


@frozen_record(eq=False)
class TextSamples:
    """One column of a text file, decoded anew each time it is walked, or taken from a spool.

    Attributes:
        source: The data rows, decoded for one column.
        index: Where blocks begin.
        dropped: Rows that take no part, in order.
        n_rows: Rows of the file up to the last that counts.
        dtype: Type of a sample.
        origin: Subtracted from each value.
        times: Factor after that.
        over: Divisor after that.
        spool: Where its values are kept, if anywhere.
        place: Which column of the spool it is.
    """

    source: DataRows
    index: BlockIndex
    dropped: NDArray[np.int64]
    n_rows: int
    dtype: np.dtype[np.generic]
    origin: float = 0.0
    times: float = 1.0
    over: float = 1.0
    spool: ColumnSpool | None = None
    place: int = 0

    @property
    def size(self) -> int:
        """Number of samples."""
        return self.n_rows - int(self.dropped.size)

    def blocks(self, start: int = 0, stop: int | None = None) -> Iterator[AnyArray]:
        """Yield consecutive pieces of the samples ``start`` to ``stop``."""
        end = self.size if stop is None else min(stop, self.size)
        row, offset = self.index.before(start)
        at = row - int(np.searchsorted(self.dropped, row))
        for column in self._columns(row, offset):
            if at >= end:
                return
            values = self._kept(column, row)
            piece = values[max(0, start - at) : end - at]
            row += column.size
            at += values.size
            if piece.size:
                yield self._scaled(piece)

    def _columns(self, row: int, offset: int) -> Iterator[NDArray[np.float64]]:
        """Yield the values of the blocks from one on."""
        if self.spool is None:
            yield from (decoded.table[:, 0] for _, decoded in self.source.decoded(offset))
            return
        n_blocks = len(self.index.rows)
        n_bytes = self.size * 8
        for block in range(self.index.number(row), n_blocks):
            yield self.spool.read(block, self.place)
            tell("measuring", n_bytes * (block + 1) // n_blocks, n_bytes)

    def _kept(self, values: NDArray[np.float64], row: int) -> NDArray[np.float64]:
        values = values[: max(0, self.n_rows - row)]
        first, last = np.searchsorted(self.dropped, [row, row + values.size])
        return np.delete(values, self.dropped[first:last] - row) if last > first else values

    def _scaled(self, values: NDArray[np.float64]) -> AnyArray:
        if self.origin or self.times != 1.0 or self.over != 1.0:
            values = (values - self.origin) * self.times / self.over
        return values.astype(self.dtype, copy=False)
