"""Where lines end: in LF, CR LF or CR, also in one file by turns."""

from __future__ import annotations

import re

from benchtool.formats.content import HEAD_BYTES, Content

MOST_HEAD_BYTES = 1 << 24
_FEW_LINES = 24
_LINE_END = re.compile(rb"\r?\r\n|\r|\n")


def with_newlines(data: bytes) -> bytes:
    """Return text whose lines end in LF alone.

    CR CR LF, which a CR LF becomes by another translation, is one line end.
    """
    if b"\r" not in data:
        return data
    if b"\r\r\n" in data:
        data = data.replace(b"\r\r\n", b"\n")
    return data.replace(b"\r\n", b"\n").replace(b"\r", b"\n")


def whole_lines(data: bytes) -> int:
    """Return how many of the bytes are whole lines; a CR at the very end may lack its LF."""
    return max(data.rfind(b"\n"), data.rfind(b"\r", 0, len(data) - 1)) + 1


def line_offset(data: bytes, line: int) -> int:
    """Return where a line begins, counted from 0."""
    at = 0
    for _, match in zip(range(line), _LINE_END.finditer(data), strict=False):
        at = match.end()
    return at


def first_lines(content: Content) -> bytes:
    """Return the head of a text, and more than that where its lines are long."""
    n_bytes = HEAD_BYTES
    head = content.head(n_bytes)
    while len(head) == n_bytes < MOST_HEAD_BYTES and not _holds_lines(head):
        n_bytes *= 4
        head = content.head(n_bytes)
    return head


def _holds_lines(head: bytes) -> bool:
    return head.count(b"\n") + head.count(b"\r") >= _FEW_LINES
