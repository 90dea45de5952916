"""Bytes of a file that grows, or of standard input, as far as they have come."""

from __future__ import annotations

import os
import select
import sys
from pathlib import Path
from typing import BinaryIO, Protocol

from benchtool.errors import InputError, NotConnectedError, Step

CHUNK_BYTES = 1 << 20


class Growth(Protocol):
    """Something that grows.

    Attributes:
        source: Its name, as the user gave it.
        begun_anew: Set where what comes now continues nothing; whoever sees it clears it.
    """

    source: str
    begun_anew: bool

    def more(self) -> bytes:
        """Return what has come since, at most a chunk; nothing where nothing has.

        Raises:
            InstrumentError: If nothing will come any more.
        """
        ...

    def skip_to_last(self, n_bytes: int) -> bool:
        """Pass over all but the last bytes, where that can be done; return whether it was."""
        ...

    def close(self) -> None:
        """Let go of it."""
        ...


class GrowingFile:
    """A file to which something is appended; one that was replaced or cut short begins anew.

    Args:
        path: The file.

    Raises:
        InputError: If it cannot be opened.
    """

    def __init__(self, path: str | Path) -> None:
        self.source = str(path)
        self.begun_anew = False
        self._path = Path(path)
        self._file = self._opened()

    def _opened(self) -> BinaryIO:
        try:
            return self._path.open("rb", buffering=0)
        except OSError as error:
            missing = isinstance(error, FileNotFoundError)
            raise InputError(
                f"{self.source} cannot be read: {error.strerror or error}",
                hint="check the path; a file that is still to come has to be there first",
                code="no-such-file" if missing else "unreadable",
            ) from None

    def more(self) -> bytes:
        """Return what was appended since; nothing where nothing was."""
        self._look_for_another()
        return self._file.read(CHUNK_BYTES) or b""

    def _look_for_another(self) -> None:
        """Begin anew where the name stands for another file now, or for less of it."""
        try:
            now = self._path.stat()
        except OSError:  # between being moved away and being written again
            return
        ours = os.fstat(self._file.fileno())
        if (now.st_ino, now.st_dev) != (ours.st_ino, ours.st_dev):
            if ours.st_size > self._file.tell():
                return  # what is left of the old one comes first
            self._file.close()
            self._file = self._opened()
            self.begun_anew = True
        elif now.st_size < self._file.tell():
            self._file.seek(0)
            self.begun_anew = True

    def skip_to_last(self, n_bytes: int) -> bool:
        """Pass over all but the last bytes; return whether any were."""
        place = os.fstat(self._file.fileno()).st_size - n_bytes
        if place <= self._file.tell():
            return False
        self._file.seek(place)
        return True

    def close(self) -> None:
        """Close the file."""
        self._file.close()


class GrowingPipe:
    """Standard input, until its writer closes it."""

    def __init__(self, pipe: BinaryIO | None = None) -> None:
        self.source = "-"
        self.begun_anew = False
        self._pipe = pipe or sys.stdin.buffer
        self._n_bytes = 0

    def more(self) -> bytes:
        """Return what has come since; nothing where nothing has.

        Raises:
            NotConnectedError: ``stream-ended``: when the writer has closed it.
        """
        number = self._pipe.fileno()
        if os.name == "posix" and not select.select([number], [], [], 0)[0]:
            return b""
        data = os.read(number, CHUNK_BYTES)
        if not data:
            raise NotConnectedError(
                "standard input has ended",
                hint="what came before stands; start the writer again for more",
                step=Step(resource="-", last_good=f"{self._n_bytes} bytes read"),
                code="stream-ended",
            )
        self._n_bytes += len(data)
        return data

    def skip_to_last(self, n_bytes: int) -> bool:  # noqa: ARG002 - a pipe cannot be wound on
        """Pass over nothing."""
        return False

    def close(self) -> None:
        """Let go of it; standard input is the program's own."""
