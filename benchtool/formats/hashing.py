"""The hash of a large file, taken beside the reading of it."""

from __future__ import annotations

import hashlib
import threading
from pathlib import Path

_CHUNK = 1 << 18


class Hashing:
    """Takes the SHA-256 of the first bytes of a file in a thread of its own.

    Hashing releases the interpreter, and on two cores a file is hashed in the time that decoding
    it takes anyway. The thread ends with the process and holds nothing that must be put away.

    Args:
        path: The file.
        size: How many bytes of it count: those that were there when it was opened.
    """

    def __init__(self, path: Path, size: int) -> None:
        self._path, self._size = path, size
        self._digest = hashlib.sha256()
        self._fault: OSError | None = None
        self._thread = threading.Thread(target=self._run, daemon=True)
        self._thread.start()

    def _run(self) -> None:
        left, chunk = self._size, memoryview(bytearray(_CHUNK))
        try:
            with self._path.open("rb", buffering=0) as file:
                while left and (n := file.readinto(chunk[: min(left, _CHUNK)])):
                    self._digest.update(chunk[:n])
                    left -= n
        except OSError as error:
            self._fault = error

    def finish(self) -> str:
        """Wait for the end and return the digest in hexadecimal.

        Raises:
            OSError: If the file could not be read to its end.
        """
        self._thread.join()
        if self._fault is not None:
            raise self._fault
        return self._digest.hexdigest()
