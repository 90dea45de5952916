"""Delimited text of any layout, found by structure and not by origin."""

from __future__ import annotations

import re
from pathlib import Path
from typing import BinaryIO

from benchtool.formats.claim import Claim, Format
from benchtool.formats.content import Content
from benchtool.formats.text.encoding import looks_like_text
from benchtool.model.capture import Capture, ReadOptions

_OTHER_TEXT = re.compile(
    rb"\s*\$(?:date|version|comment|timescale|scope|var|enddefinitions|dumpvars)\b"
)


def sniff(head: bytes, suffix: str) -> Claim:
    """Claim whatever is text; never surely, since other formats are written in text too."""
    del suffix
    if not looks_like_text(head) or _OTHER_TEXT.match(head.removeprefix(b"\xef\xbb\xbf")):
        return Claim.NO
    return Claim.MAYBE


def _read(content: Content, options: ReadOptions) -> Capture:
    from benchtool.formats.text.reader import read_text

    return read_text(content, options)


def _write(capture: Capture, file: BinaryIO | Path) -> None:
    from benchtool.formats.text.writing import write_text

    write_text(capture, file)


FORMAT = Format(
    name="text",
    suffixes=(".csv", ".txt", ".tsv", ".dat", ".asc", ".log"),
    sniff=sniff,
    read=_read,
    write=_write,
)
