"""Zero bytes at the end of a file: what a power loss leaves of blocks never written."""

from __future__ import annotations

from dataclasses import replace

from benchtool.formats.content import Content
from benchtool.model.quantity import Notice

_CHUNK = 1 << 16


def without_zeros(content: Content) -> tuple[Content, int]:
    """Return the content without the zero bytes that it ends in, and their number."""
    size = content.size
    with content.open() as file:
        while size:
            at = max(0, size - _CHUNK)
            file.seek(at)
            kept = file.read(size - at).rstrip(b"\0")
            size = at + len(kept)
            if kept:
                break
    return replace(content, size=size), content.size - size


def zeros_notice(n_zeros: int) -> tuple[Notice, ...]:
    """Say that a file ends in zero bytes, where it does."""
    if not n_zeros:
        return ()
    text = f"the file ends in {n_zeros} zero bytes, as a power loss leaves; it was read up to them"
    return (Notice(code="file-cut", text=text),)
