"""What is kept in memory while it is little, and in a temporary file after: bytes, and columns."""

from __future__ import annotations

import atexit
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, BinaryIO

import numpy as np

from benchtool.model.arrays import AnyArray, FloatArray

if TYPE_CHECKING:
    from io import FileIO

COLUMNS_IN_MEMORY_BYTES = 32 << 20


class Spool:
    """Collects chunks; goes over to a temporary file, removed at exit, beyond a limit."""

    def __init__(self, limit: int) -> None:
        self.size = 0
        self._limit = limit
        self._chunks: list[bytes] = []
        self._file: BinaryIO | None = None
        self._path: Path | None = None

    def write(self, chunk: bytes) -> None:
        """Append ``chunk``."""
        self.size += len(chunk)
        if self._file is None and self.size > self._limit:
            self._start_file()
        if self._file is None:
            self._chunks.append(chunk)
        else:
            self._file.write(chunk)

    def _start_file(self) -> None:
        import tempfile

        with tempfile.NamedTemporaryFile(prefix="benchtool-", delete=False) as named:
            self._path = Path(named.name)
        atexit.register(self._path.unlink, missing_ok=True)
        self._file = self._path.open("wb")
        for chunk in self._chunks:
            self._file.write(chunk)
        self._chunks.clear()

    def finish(self) -> tuple[bytes | None, Path | None]:
        """Return the bytes, or the path of the file that holds them."""
        if self._file is None:
            return b"".join(self._chunks), None
        self._file.close()
        return None, self._path


class ColumnSpool:
    """Collects columns block by block, so that later walks need not decode them again.

    Beyond a limit they go to a temporary file without a name, which the system removes with the
    process. Where there is no room for it, nothing is kept and ``whole`` is false.

    Args:
        limit: Bytes held in memory; None for ``COLUMNS_IN_MEMORY_BYTES``.
    """

    def __init__(self, limit: int | None = None) -> None:
        self.whole = True
        self._limit = COLUMNS_IN_MEMORY_BYTES if limit is None else limit
        self._size = 0
        self._held: list[AnyArray] = []
        self._file: FileIO | None = None
        self._blocks: list[list[tuple[int, int, np.dtype[Any]]]] = []

    def append(self, columns: Sequence[AnyArray]) -> None:
        """Take the next block: one array a column, each in whatever type holds it."""
        if not self.whole:
            return
        places = []
        for column in columns:
            places.append((self._size, int(column.size), column.dtype))
            self._held.append(np.ascontiguousarray(column))
            self._size += column.nbytes
        self._blocks.append(places)
        if self._file is not None or self._size > self._limit:
            self._write_out()

    def read(self, block: int, column: int) -> FloatArray:
        """Return a column of a block."""
        offset, n, dtype = self._blocks[block][column]
        if self._file is None:
            held = self._held[block * len(self._blocks[0]) + column]
            return held.astype(np.float64, copy=False)
        self._file.seek(offset)
        left, parts = n * dtype.itemsize, list[bytes]()
        while left and (part := self._file.read(left)):
            parts.append(part)
            left -= len(part)
        return np.frombuffer(b"".join(parts), dtype).astype(np.float64, copy=False)

    def _write_out(self) -> None:
        """Put what is held into the file."""
        try:
            if self._file is None:
                self._file = _nameless_file(self)
            for column in self._held:
                view = column.data.cast("B") if column.size else memoryview(b"")
                while view:
                    view = view[self._file.write(view) or 0 :]
        except OSError:  # a full disk costs the time of decoding anew, and nothing else
            self.whole = False
            if self._file is not None:
                self._file.truncate(0)
        self._held.clear()


def _nameless_file(owner: object) -> FileIO:
    """Open a temporary file without a name, closed with its owner."""
    import tempfile
    import weakref

    file: FileIO = tempfile.TemporaryFile(prefix="benchtool-", buffering=0)  # noqa: SIM115 - closed with its owner
    weakref.finalize(owner, file.close)
    return file
