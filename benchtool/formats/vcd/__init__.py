"""Value change dump, IEEE 1364-2005 clause 18."""

from __future__ import annotations

import re
from pathlib import Path
from typing import BinaryIO

from benchtool.formats.claim import Claim, Format
from benchtool.formats.content import Content
from benchtool.model.capture import Capture, ReadOptions

_OPENING = re.compile(rb"\s*\$(?:date|version|comment|timescale|scope|var|enddefinitions)\b")


def sniff(head: bytes, suffix: str) -> Claim:
    """Claim text that opens with a declaration section; surely if it declares variables."""
    if not _OPENING.match(head.removeprefix(b"\xef\xbb\xbf")):
        return Claim.NO
    declares = b"$var" in head or b"$enddefinitions" in head
    return Claim.YES if declares or suffix == ".vcd" else Claim.MAYBE


def _read(content: Content, options: ReadOptions) -> Capture:
    from benchtool.formats.vcd.reader import read_vcd

    return read_vcd(content, options)


def _write(capture: Capture, file: BinaryIO | Path) -> None:
    from benchtool.formats.vcd.writing import write_vcd

    write_vcd(capture, file)


FORMAT = Format(name="vcd", suffixes=(".vcd",), sniff=sniff, read=_read, write=_write)
