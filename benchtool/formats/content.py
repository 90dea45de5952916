"""The edge to the file system: opening a file, hashing it and peeling its gz shell.

Nothing else in this room opens a capture by name. What comes out is a ``Content``: the bytes of
the capture itself, in memory where they are few, on disk otherwise.
"""

from __future__ import annotations

import errno
import hashlib
import io
import stat
import sys
from collections.abc import Iterator
from dataclasses import field, replace
from pathlib import Path
from typing import TYPE_CHECKING, BinaryIO

from benchtool.errors import InputError, MalformedCaptureError
from benchtool.formats.spool import Spool
from benchtool.frozen import frozen_record
from benchtool.model.capture import Capture, StructurePoint
from benchtool.model.quantity import Notice

if TYPE_CHECKING:
    from benchtool.formats.hashing import Hashing

HEAD_BYTES = 1 << 16
IN_MEMORY_BYTES = 32 << 20
_CHUNK = 1 << 20
GZ_MAGIC = b"\x1f\x8b\x08"


@frozen_record(eq=False)
class Content:
    """The bytes of one capture, gz peeled.

    Attributes:
        source: File name as given, or ``-``.
        suffix: Suffix in lower case with its dot, ``.gz`` taken off.
        sha256: Of the bytes as stored, before peeling; empty while ``hashing`` goes on.
        size: Number of bytes after peeling.
        stored: Number of bytes before it, where the file is large.
        data: The bytes, where they are few.
        path: The file that holds them, where they are many.
        warnings: What was seen on the way here.
        structure: What was found about the outer structure.
        hashing: The hash of a large file, being taken meanwhile.
    """

    source: str
    suffix: str
    sha256: str
    size: int
    data: bytes | None = field(default=None, repr=False)
    path: Path | None = None
    warnings: tuple[Notice, ...] = ()
    structure: tuple[StructurePoint, ...] = ()
    stored: int = 0
    hashing: Hashing | None = None

    def open(self) -> BinaryIO:
        """Open the bytes for reading; the caller closes."""
        if self.path is not None:
            return self.path.open("rb")
        return io.BytesIO(self.data or b"")

    def head(self, n_bytes: int = HEAD_BYTES) -> bytes:
        """Return the first bytes."""
        with self.open() as file:
            return file.read(min(n_bytes, self.size))

    def tail(self, n_bytes: int = HEAD_BYTES) -> bytes:
        """Return the last bytes."""
        with self.open() as file:
            file.seek(max(0, self.size - n_bytes))
            return file.read(min(n_bytes, self.size))

    def chunks(self, n_bytes: int = _CHUNK) -> Iterator[bytes]:
        """Yield the bytes in pieces."""
        left = self.size
        with self.open() as file:
            while left and (chunk := file.read(min(n_bytes, left))):
                left -= len(chunk)
                yield chunk

    def settled(self, capture: Capture) -> Capture:
        """Return a capture that was read from here, with its hash, and what is said of both.

        Raises:
            InputError: If the file could not be read to its end.
        """
        if self.hashing is None:
            return capture
        try:
            origin = replace(capture.origin, sha256=self.hashing.finish())
        except OSError as error:
            raise input_error(error, self.source) from error
        return replace(capture, origin=origin, warnings=(*self._growth(), *capture.warnings))

    def _growth(self) -> tuple[Notice, ...]:
        """Say that the file grew meanwhile, if it did."""
        try:
            more = Path(self.source).stat().st_size - self.stored
        except OSError:
            return ()
        if more <= 0:
            return ()
        text = (
            f"{self.source} grew by {more} bytes while it was read; the {self.stored} bytes that "
            "it had at first were read"
        )
        return (Notice(code="file-grew", text=text),)


def open_content(source: str | Path, in_memory_bytes: int = IN_MEMORY_BYTES) -> Content:
    """Open ``source``, hash it and peel its gz shell.

    Args:
        source: A path, or ``-`` for standard input.
        in_memory_bytes: Content up to this size is held in memory.

    Raises:
        InputError: If it cannot be read; each reason has its code.
        MalformedCaptureError: If it holds no bytes (``empty-file``).
    """
    try:
        stored = _open_stored(str(source), in_memory_bytes)
    except OSError as error:
        raise input_error(error, str(source)) from error
    if stored.size == 0:
        raise MalformedCaptureError(
            f"{stored.source} is empty (0 bytes)",
            hint="Save the capture again; the instrument or the copy wrote nothing.",
            path=stored.source,
            code="empty-file",
        )
    if stored.head(3) != GZ_MAGIC:
        return stored
    from benchtool.formats.peeling import peel_gz

    return peel_gz(stored, in_memory_bytes)


def input_error(error: OSError, source: str) -> InputError:
    """Map what the operating system says to one of our errors."""
    says, hint, code = _REASONS.get(
        error.errno or 0,
        (f"cannot be read: {error.strerror or error}", "Copy the file to a local disk.", "input"),
    )
    return InputError(f"{source} {says}", hint=hint, code=code)


_REASONS = {
    errno.ENOENT: ("does not exist", "Check the name and the folder.", "no-such-file"),
    errno.ENOTDIR: ("does not exist", "Check the name and the folder.", "no-such-file"),
    errno.EISDIR: (
        "is a directory, not a capture",
        "Name one file of it; a shell loop takes them all.",
        "is-directory",
    ),
    errno.EACCES: ("may not be read", "Ask for read permission on the file.", "no-permission"),
    errno.EPERM: ("may not be read", "Ask for read permission on the file.", "no-permission"),
    errno.ELOOP: (
        "is a symbolic link that leads back to itself",
        "Name the file that it should lead to.",
        "symlink-loop",
    ),
    errno.ENAMETOOLONG: ("does not exist: the name is too long", "Check it.", "no-such-file"),
}


def _open_stored(source: str, limit: int) -> Content:
    if source == "-":
        return _spool(sys.stdin.buffer, source, limit)
    path = Path(source)
    status = path.stat()
    if stat.S_ISDIR(status.st_mode):
        raise IsADirectoryError(errno.EISDIR, "is a directory", source)
    with path.open("rb") as file:
        if not stat.S_ISREG(status.st_mode):
            return _spool(file, source, limit)
        if status.st_size <= limit:
            return _in_memory(file.read(), source)
    from benchtool.formats.hashing import Hashing

    size = status.st_size
    return Content(
        source=source,
        suffix=_suffix(source),
        sha256="",
        size=size,
        path=path,
        stored=size,
        hashing=Hashing(path, size),
    )


def _in_memory(data: bytes, source: str) -> Content:
    digest = hashlib.sha256(data).hexdigest()
    return Content(source=source, suffix=_suffix(source), sha256=digest, size=len(data), data=data)


def _spool(stream: BinaryIO, source: str, limit: int) -> Content:
    spool, digest = Spool(limit), hashlib.sha256()
    while chunk := stream.read(_CHUNK):
        digest.update(chunk)
        spool.write(chunk)
    data, path = spool.finish()
    return Content(
        source=source,
        suffix=_suffix(source),
        sha256=digest.hexdigest(),
        size=spool.size,
        data=data,
        path=path,
    )


def _suffix(source: str) -> str:
    name = source.lower().removesuffix(".gz")
    return Path(name).suffix
