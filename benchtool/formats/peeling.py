"""The gz shell of a file (RFC 1952) taken off, as far as it is whole."""

from __future__ import annotations

import contextlib
import zlib
from dataclasses import replace
from typing import Protocol

from benchtool.errors import MalformedCaptureError, UnknownStructureError
from benchtool.formats.content import GZ_MAGIC, Content
from benchtool.formats.spool import Spool
from benchtool.model.capture import StructurePoint
from benchtool.model.quantity import Notice
from benchtool.model.watching import tell

_GZ_CHUNK = 1 << 16  # one chunk may swell a thousandfold


def peel_gz(stored: Content, limit: int) -> Content:
    """Decompress, keeping what can be had of a cut or damaged file.

    Args:
        stored: The file.
        limit: What comes out is held in memory up to this size.

    Raises:
        MalformedCaptureError: If nothing comes out (``empty-file``), or another gz file.
    """
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
    point = StructurePoint(
        name="compression", value="gz", evidence="magic bytes 1f 8b", sure="stated"
    )
    warnings = () if notice is None else (notice,)
    peeled = replace(
        stored, data=data, path=path, size=spool.size, warnings=warnings, structure=(point,)
    )
    if peeled.head(3) == GZ_MAGIC:
        what = f"{stored.source} is a gz file inside a gz file"
        hint = "Unpack it once, and hand over what comes out."
        raise UnknownStructureError(what, hint=hint)
    return peeled


def _inflate(stored: Content, spool: Spool) -> Notice | None:
    """Write the members of a gz file to ``spool``; return what was wrong with it."""
    inflater = zlib.decompressobj(wbits=31)
    taken = 0
    for chunk in stored.chunks(_GZ_CHUNK):
        rest, taken = chunk, taken + len(chunk)
        tell("unpacking", taken, stored.size)
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
            if not rest.startswith(GZ_MAGIC[: len(rest)]):
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
