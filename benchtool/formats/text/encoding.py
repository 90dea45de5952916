"""The encoding of a text file, and bytes that ASCII tools can walk."""

from __future__ import annotations

import codecs
from dataclasses import replace

from benchtool.formats.content import IN_MEMORY_BYTES, Content
from benchtool.formats.spool import Spool
from benchtool.frozen import frozen_record

_MARKS = (
    (codecs.BOM_UTF8, "utf-8"),
    (codecs.BOM_UTF32_LE, "utf-32-le"),
    (codecs.BOM_UTF32_BE, "utf-32-be"),
    (codecs.BOM_UTF16_LE, "utf-16-le"),
    (codecs.BOM_UTF16_BE, "utf-16-be"),
)
_CONTROL = bytes(set(range(32)) - {9, 10, 12, 13, 27})
_HIGH = bytes(range(128, 256))


@frozen_record(eq=False)
class Encoding:
    """An encoding, the bytes of its mark at the start, and what it was found from."""

    name: str
    n_mark: int
    evidence: str

    @property
    def is_wide(self) -> bool:
        """Whether a character takes two or four bytes."""
        return self.name.startswith(("utf-16", "utf-32"))

    def decode(self, head: bytes) -> str:
        """Return the text of the first bytes; a character cut at the end is left out."""
        decoder = codecs.getincrementaldecoder(self.name)(errors="replace")
        return decoder.decode(head[self.n_mark :])


def find_encoding(head: bytes) -> Encoding:
    """Return the encoding of a text from its first bytes."""
    for mark, name in _MARKS:
        if head.startswith(mark):
            return Encoding(name=name, n_mark=len(mark), evidence="byte order mark")
    body = head.rstrip(b"\0")
    even, odd = body[0::2].count(0), body[1::2].count(0)
    if max(even, odd) > 0.3 * len(body) / 2 and min(even, odd) < 0.1 * len(body) / 2:
        name = "utf-16-be" if even > odd else "utf-16-le"
        return Encoding(name=name, n_mark=0, evidence="every second byte is zero")
    if head.translate(None, _HIGH) != head:
        return _eight_bit(head)
    return Encoding(name="ascii", n_mark=0, evidence="no byte above 127")


def _eight_bit(head: bytes) -> Encoding:
    try:
        codecs.getincrementaldecoder("utf-8")().decode(head)
    except UnicodeDecodeError:
        return Encoding(name="latin-1", n_mark=0, evidence="bytes that are not UTF-8")
    return Encoding(name="utf-8", n_mark=0, evidence="valid UTF-8")


def looks_like_text(head: bytes) -> bool:
    """Say whether the first bytes of a file can be text at all."""
    encoding = find_encoding(head)
    if encoding.is_wide:
        text = encoding.decode(head)
        return text.isascii() or sum(c < "\u0500" for c in text) > 0.95 * len(text)
    body = head.replace(b"\0" * 16, b"").rstrip(b"\0")  # a power cut leaves zeros
    n_control = len(body) - len(body.translate(None, _CONTROL))
    n_high = len(body) - len(body.translate(None, _HIGH))
    foreign = n_high if encoding.name == "latin-1" else 0
    return bool(body) and n_control <= 0.02 * len(body) and foreign <= 0.2 * len(body)


def narrowed(content: Content, encoding: Encoding) -> Content:
    """Return the content with one byte for each ASCII character, transcoded where it has not."""
    if not encoding.is_wide:
        return content
    limit = IN_MEMORY_BYTES if content.data is not None else 0
    spool = Spool(limit)
    decoder = codecs.getincrementaldecoder(encoding.name)(errors="replace")
    skip = encoding.n_mark
    for chunk in content.chunks():
        spool.write(decoder.decode(chunk[skip:]).encode("utf-8"))
        skip = 0
    data, path = spool.finish()
    return replace(content, data=data, path=path, size=spool.size)
