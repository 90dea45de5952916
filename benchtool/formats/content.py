"""The edge to the file system: opening a file, hashing it and peeling its gz shell.

Nothing else in this room opens a file by name. What comes out is a ``Content``: the bytes of
the capture itself, in memory where they are few, on disk otherwise.
"""

from __future__ import annotations

import contextlib
import errno
import hashlib
import io
import stat
import sys
from collections.abc import Iterator
from dataclasses import field, replace
from pathlib import Path
from typing import BinaryIO, Protocol

from benchtool.errors import InputError, MalformedCaptureError
from benchtool.formats.spool import Spool
from benchtool.frozen import frozen_record
from benchtool.model.capture import StructurePoint
from benchtool.model.quantity import Notice

HEAD_BYTES = 1 << 16
IN_MEMORY_BYTES = 32 << 20
_CHUNK = 1 << 20
_GZ_CHUNK = 1 << 16  # one chunk may swell a thousandfold
_GZ_MAGIC = b"\x1f\x8b\x08"


@frozen_record(eq=False)
class Content:
    """The bytes of one capture, gz peeled.

    Attributes:
        source: File name as given, or ``-``.
        suffix: Suffix in lower case with its dot, ``.gz`` taken off.
        sha256: Of the bytes as stored, before peeling.
        size: Number of bytes after peeling.
        data: The bytes, where they are few.
        path: The file that holds them, where they are many.
        warnings: What was seen on the way here.
        structure: What was found about the outer structure.
    """

    source: str
    suffix: str
    sha256: str
    size: int
    data: bytes | None = field(default=None, repr=False)
    path: Path | None = None
    warnings: tuple[Notice, ...] = ()
    structure: tuple[StructurePoint, ...] = ()

    def open(self) -> BinaryIO:
        """Open the bytes for reading; the caller closes."""
        if self.path is not None:
            return self.path.open("rb")
        return io.BytesIO(self.data or b"")

    def head(self, n_bytes: int = HEAD_BYTES) -> bytes:
        """Return the first bytes."""
        with self.open() as file:
            return file.read(n_bytes)

    def tail(self, n_bytes: int = HEAD_BYTES) -> bytes:
        """Return the last bytes."""
        with self.open() as file:
            file.seek(max(0, self.size - n_bytes))
            return file.read()

    def chunks(self, n_bytes: int = _CHUNK) -> Iterator[bytes]:
        """Yield the bytes in pieces."""
        with self.open() as file:
            while chunk := file.read(n_bytes):
                yield chunk


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
    if stored.head(3) != _GZ_MAGIC:
        return stored
    return _peel_gz(stored, in_memory_bytes)


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
        digest = hashlib.file_digest(file, "sha256").hexdigest()
    return Content(
        source=source, suffix=_suffix(source), sha256=digest, size=status.st_size, path=path
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


def _peel_gz(stored: Content, limit: int) -> Content:
    """Decompress, keeping what can be had of a cut or damaged file."""
    spool = Spool(limit)
    notice = _inflate(stored, spool)
    data, path = spool.finish()
    if spool.size == 0:
        raise MalformedCaptureError(
            f"{stored.source} is a gz file that holds nothing readable",
            hint="Copy or download the file again.",
            path=stored.source,
            code="empty-file",
        )
    point = StructurePoint(name="compression", value="gz", evidence="magic bytes 1f 8b")
    warnings = () if notice is None else (notice,)
    return replace(
        stored, data=data, path=path, size=spool.size, warnings=warnings, structure=(point,)
    )


def _inflate(stored: Content, spool: Spool) -> Notice | None:
    """Write the members of a gz file to ``spool``; return what was wrong with it."""
    import zlib

    inflater = zlib.decompressobj(wbits=31)
    for chunk in stored.chunks(_GZ_CHUNK):
        rest = chunk
        while rest:
            before = inflater.copy()
            try:
                spool.write(inflater.decompress(rest))
            except zlib.error as error:
                _salvage(before, rest, spool)
                return _damaged(stored, str(error), spool.size)
            rest = inflater.unused_data
            if not inflater.eof or not rest:
                break
            if not rest.startswith(_GZ_MAGIC[: len(rest)]):
                return None  # padding after the last member
            inflater = zlib.decompressobj(wbits=31)
    if inflater.eof:
        return None
    return Notice(
        code="file-cut",
        text=f"{stored.source} ends inside its gz shell; the first {spool.size} bytes were read",
    )


def _salvage(inflater: _Inflater, chunk: bytes, spool: Spool) -> None:
    """Take byte by byte what comes before the damage."""
    import zlib

    with contextlib.suppress(zlib.error):
        for i in range(len(chunk)):
            spool.write(inflater.decompress(chunk[i : i + 1]))


class _Inflater(Protocol):
    def decompress(self, data: bytes, /) -> bytes: ...


def _damaged(stored: Content, reason: str, n_bytes: int) -> Notice:
    return Notice(
        code="gz-damaged",
        text=f"the gz shell of {stored.source} is damaged ({reason}); "
        f"the first {n_bytes} bytes were read",
    )
