"""Bytes of unknown length, kept in memory while they are few and in a temporary file after."""

from __future__ import annotations

import atexit
from pathlib import Path
from typing import BinaryIO


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
