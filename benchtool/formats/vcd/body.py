"""Value changes of a dump (IEEE 1364-2005, 18.2.1), walked in blocks.

A block in which every word is of the common kinds is taken by whole-array arithmetic; any other,
and any in which something is wrong, word by word, which is where the rules stand.
"""

from __future__ import annotations

from typing import BinaryIO

from benchtool.errors import MalformedCaptureError
from benchtool.formats.content import Content
from benchtool.formats.vcd.blocks import BlockWalk
from benchtool.formats.vcd.changes import Body
from benchtool.formats.vcd.splitting import PAD, TAIL
from benchtool.formats.vcd.words import WordWalk
from benchtool.model.watching import tell

_BLOCK = 1 << 19
_LONGEST_WORD = 1 << 22
_SPACES = (b"\n", b"\r", b" ", b"\t", b"\v", b"\f")


def read_body(content: Content, offset: int, body: Body) -> None:
    """Walk the value changes from byte ``offset`` on and fill ``body``.

    Args:
        content: The file.
        offset: Where the changes begin.
        body: Its dictionaries name the wanted variables.

    Raises:
        MalformedCaptureError: If times run backwards or a word is no value change.
    """
    words, blocks = WordWalk(body), BlockWalk(body)
    with content.open() as file:
        file.seek(offset)
        rest = _walk(file, content.size - offset, words, blocks)
    final = rest.rstrip(b"\0").split()
    if final and _may_be_cut(final[-1], rest, body.known):
        words.take(final[:-1], last=True)
        body.cut = body.cut or final[-1].decode("latin-1")
    else:
        words.take(final, last=True)


def _walk(file: BinaryIO, n_bytes: int, words: WordWalk, blocks: BlockWalk) -> bytes:
    """Take the words of the next bytes; return what is left over, which may be cut."""
    rest, total = b"", n_bytes
    while block := file.read(min(_BLOCK, n_bytes)):
        n_bytes -= len(block)
        tell("reading", total - n_bytes, total)
        taken = None
        if not words.in_comment and b"\0" not in block:
            data = b"".join((PAD, rest, block, TAIL))
            taken = blocks.take(data)
        if taken is None:
            rest = _take_words(rest + block, words)
        else:
            rest = data[len(PAD) + taken : -len(TAIL)]
    return rest


def _take_words(data: bytes, words: WordWalk) -> bytes:
    """Take the whole words of a block one by one; return what is left over."""
    if len(data) > _LONGEST_WORD:
        data = _without_zeros(data, words.body.source)
    at = 1 + max(data.rfind(space) for space in _SPACES)
    left = words.take(data[:at].replace(b"\0", b"").split())
    return b"".join(word + b"\n" for word in left) + data[at:]


def _without_zeros(data: bytes, source: str) -> bytes:
    """Return a long piece without its zero bytes.

    Raises:
        MalformedCaptureError: If it is one word of endless length.
    """
    kept = data.replace(b"\0", b"")
    if len(kept) <= _LONGEST_WORD or len(kept.split(None, 1)) > 1:
        return kept
    raise MalformedCaptureError(
        f"{source} is damaged: a word of more than {_LONGEST_WORD} bytes begins with "
        f"{data[:20].decode('latin-1')!r}",
        hint="Save the capture again.",
        path=source,
    )


def _may_be_cut(word: bytes, rest: bytes, known: frozenset[bytes]) -> bool:
    """Whether the file ends in a word whose code may have been meant to go on."""
    code = word[1:] if word[0] in b"01xXzZ" else b""
    if not code or rest[-1:].isspace() or code not in known:
        return False
    return any(other != code and other.startswith(code) for other in known)
