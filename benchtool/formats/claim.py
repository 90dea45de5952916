"""What a format must offer to take part: a name, a claim on a file's head, and a reader."""

from __future__ import annotations

from collections.abc import Callable
from enum import IntEnum
from pathlib import Path
from typing import BinaryIO

from benchtool.formats.content import Content
from benchtool.frozen import frozen_record
from benchtool.model.capture import Capture, ReadOptions


class Claim(IntEnum):
    """How sure a format is that a file is its own; the single highest claim wins."""

    NO = 0
    MAYBE = 1
    YES = 2


Sniff = Callable[[bytes, str], Claim]
Read = Callable[[Content, ReadOptions], Capture]
Write = Callable[[Capture, BinaryIO | Path], None]


@frozen_record(eq=False)
class Format:
    """One file structure.

    Attributes:
        name: Its name for ``--format``.
        suffixes: File suffixes it usually has, with the dot, lower case.
        sniff: Takes the first 64 KiB (gz peeled) and the suffix; opens nothing, never raises.
        read: Makes a capture of a file's content.
        write: Writes a capture to a binary file object or a path; None where we write none.
    """

    name: str
    suffixes: tuple[str, ...]
    sniff: Sniff
    read: Read
    write: Write | None = None
