"""Standard input, or a file that grows, as a tap of bytes."""

from __future__ import annotations

import os
import select
import sys
import time
from typing import BinaryIO

from benchtool.errors import NotConnectedError, Step

CHUNK_BYTES = 1 << 16
_BETWEEN_LOOKS_S = 0.02


class PipeTap:
    """Reads a pipe until its writer closes it.

    Args:
        pipe: The reading end.
        name: As the user named it.
    """

    def __init__(self, pipe: BinaryIO, name: str) -> None:
        self._pipe = pipe
        self._name = name
        self._n_bytes = 0

    def read(self, timeout_s: float) -> bytes:
        """Return what is there, or comes within the time.

        Raises:
            NotConnectedError: ``stream-ended``: when the writer has closed it.
        """
        fileno = self._pipe.fileno()
        if os.name == "posix" and not select.select([fileno], [], [], timeout_s)[0]:
            return b""
        data = os.read(fileno, CHUNK_BYTES)
        if not data:
            raise NotConnectedError(
                f"{self._name} has ended: its writer closed it",
                hint="what came before stands; start the writer again for more",
                step=Step(resource=self._name, last_good=f"{self._n_bytes} bytes read"),
                code="stream-ended",
            )
        self._n_bytes += len(data)
        return data

    def close(self) -> None:
        """Let go of it."""
        if self._pipe is not sys.stdin.buffer:
            self._pipe.close()


class GrowingTap:
    """Reads a file and whatever is appended to it.

    Args:
        file: The file, open for reading.
        name: As the user named it.
    """

    def __init__(self, file: BinaryIO, name: str) -> None:
        self._file = file
        self._name = name

    def read(self, timeout_s: float) -> bytes:
        """Return what was appended, or is within the time.

        Raises:
            NotConnectedError: ``stream-ended``: if the file was cut short.
        """
        until = time.monotonic() + timeout_s
        while not (data := self._file.read(CHUNK_BYTES)):
            if os.fstat(self._file.fileno()).st_size < self._file.tell():
                raise NotConnectedError(
                    f"{self._name} was cut short while it was read",
                    hint="start anew on the file as it is now",
                    step=Step(resource=self._name),
                    code="stream-ended",
                )
            if time.monotonic() > until:
                break
            time.sleep(_BETWEEN_LOOKS_S)
        return data

    def close(self) -> None:
        """Close the file."""
        self._file.close()
