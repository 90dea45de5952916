"""Declarations of a value change dump (IEEE 1364-2005, 18.2.3)."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field

from benchtool.errors import MalformedCaptureError
from benchtool.frozen import frozen_record

_TIMESCALE = re.compile(r"(1|10|100)\s*(s|ms|us|ns|ps|fs)")
PER_SECOND = {"s": 1, "ms": 10**3, "us": 10**6, "ns": 10**9, "ps": 10**12, "fs": 10**15}
_RANGE = re.compile(r"(.*?)\s*\[\s*(\d+)\s*(?::\s*(\d+)\s*)?\]")
REALS = frozenset({"real", "realtime"})
_SECTIONS = {b"$scope", b"$upscope", b"$var", b"$timescale", b"$enddefinitions", b"$date",
             b"$version", b"$comment"}  # fmt: skip


@frozen_record(eq=False)
class Variable:
    """One declared variable.

    Attributes:
        code: Identifier code.
        kind: Type of the variable, such as ``wire`` or ``real``.
        width: Bits.
        scope: Names of the scopes around it.
        name: Reference name without its range.
        bits: Index of each bit, most significant first; empty for a plain scalar.
    """

    code: bytes
    kind: str
    width: int
    scope: tuple[str, ...]
    name: str
    bits: tuple[int, ...]


@dataclass(slots=True)
class Header:
    """What the declarations say.

    Attributes:
        timescale: Multiple and unit, such as (10, "us"); None where the file states none.
        variables: All declared variables.
        version: Text of the version section.
        body: Byte offset where the value changes begin.
    """

    timescale: tuple[int, str] | None = None
    variables: list[Variable] = field(default_factory=list)
    version: str = ""
    body: int = 0


def read_header(data: bytes, source: str) -> Header:
    """Read the declarations at the start of ``data``.

    Raises:
        MalformedCaptureError: If they do not end, or a section is damaged.
    """
    header, scope = Header(), list[str]()
    for keyword, words, end in _sections(data, source):
        text = [word.decode("latin-1") for word in words]
        if keyword == b"$timescale":
            header.timescale = _timescale(" ".join(text), source)
        elif keyword == b"$scope":
            scope.append(text[-1] if text else "")
        elif keyword == b"$upscope":
            del scope[-1:]
        elif keyword == b"$var":
            header.variables.append(_variable(words, tuple(scope), source))
        elif keyword == b"$version":
            header.version = " ".join(text)
        elif keyword == b"$enddefinitions":
            header.body = end
            return header
    raise MalformedCaptureError(
        f"{source} ends within its declarations ($enddefinitions is missing)",
        hint="The file was cut; save the capture again.",
        path=source,
        code="header-cut",
    )


def _sections(data: bytes, source: str) -> Iterator[tuple[bytes, list[bytes], int]]:
    """Yield keyword, words and the offset behind ``$end`` of each section."""
    keyword: bytes | None = None
    words: list[bytes] = []
    for match in re.finditer(rb"\S+", data):
        word = match[0]
        if keyword is None:
            if word not in _SECTIONS and match.end() == len(data):
                return  # cut inside a keyword
            if word not in _SECTIONS:
                raise _damaged(f"{word[:20]!r} stands outside a section", source, match.start())
            keyword, words = word, []
        elif word == b"$end":
            yield keyword, words, match.end()
            keyword = None
        else:
            words.append(word)


def _damaged(what: str, source: str, offset: int) -> MalformedCaptureError:
    return MalformedCaptureError(
        f"the declarations of {source} are damaged: {what} (byte {offset})",
        hint="Save the capture again.",
        path=source,
        line=offset,
    )


def _timescale(text: str, source: str) -> tuple[int, str]:
    match = _TIMESCALE.fullmatch(text)
    if match is None:
        raise _damaged(f"timescale {text[:20]!r} is none of 1, 10, 100 × s … fs", source, 0)
    return int(match[1]), match[2]


def _variable(words: list[bytes], scope: tuple[str, ...], source: str) -> Variable:
    if len(words) < 4 or not words[1].isdigit():
        raise _damaged(f"variable {b' '.join(words)[:30]!r}", source, 0)
    kind, width, code = words[0].decode("latin-1"), int(words[1]), words[2]
    reference = " ".join(word.decode("latin-1") for word in words[3:])
    name, bits = reference, tuple[int, ...]()
    match = _RANGE.fullmatch(reference)
    if match and match[3] is not None and kind not in REALS:
        high, low = int(match[2]), int(match[3])
        step = -1 if high >= low else 1
        name, bits = match[1], tuple(range(high, low + step, step))
    if width > 1 and len(bits) != width:
        bits = tuple(range(width - 1, -1, -1))
    clean = "".join(c for c in name if c.isprintable())
    return Variable(code=code, kind=kind, width=width, scope=scope, name=clean, bits=bits)


def trace_names(variables: list[Variable]) -> dict[Variable, str]:
    """Return dotted names, without the scopes that all variables share."""
    shared = 0
    scopes = [v.scope for v in variables]
    while scopes and all(len(s) > shared and s[shared] == scopes[0][shared] for s in scopes):
        shared += 1
    return {v: ".".join((*v.scope[shared:], v.name)) for v in variables}
