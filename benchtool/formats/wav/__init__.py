"""RIFF WAVE: integer and floating PCM."""

from __future__ import annotations

from benchtool.formats.claim import Claim, Format
from benchtool.formats.content import Content
from benchtool.model.capture import Capture, ReadOptions

_MARKS = (b"RIFF", b"RIFX", b"RF64", b"BW64")


def sniff(head: bytes, suffix: str) -> Claim:
    """Claim by magic bytes."""
    del suffix
    return Claim.YES if head[:4] in _MARKS and head[8:12] == b"WAVE" else Claim.NO


def _read(content: Content, options: ReadOptions) -> Capture:
    from benchtool.formats.wav.reader import read_wav

    return read_wav(content, options)


FORMAT = Format(name="wav", suffixes=(".wav", ".wave"), sniff=sniff, read=_read)
