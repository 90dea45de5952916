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
_SIZE = re.compile(rb"\[(\d+):(\d+)\]")
_SECTION = re.compile(rb"\$(?!end$|dump)[a-z_]+")
_WORD = re.compile(rb"\S+")
_MARK = b"\xef\xbb\xbf"
_UNENDED = b""
WIDEST = 64
"""Vectors of more bits are left out."""
_CHANGE = re.compile(rb"#\d+|\$dump(?:vars|all|on|off|ports)")


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
        unended: Whether the value changes begin without an end of the declarations.
    """

    timescale: tuple[int, str] | None = None
    variables: list[Variable] = field(default_factory=list)
    version: str = ""
    body: int = 0
    unended: bool = False


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
        elif keyword in (b"$enddefinitions", _UNENDED):
            header.body, header.unended = end, keyword == _UNENDED
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
    for match in _WORD.finditer(data, len(_MARK) if data.startswith(_MARK) else 0):
        word = match[0]
        if keyword is None:
            if _CHANGE.fullmatch(word):
                yield _UNENDED, [], match.start()
                return
            if not _SECTION.fullmatch(word) and match.end() == len(data):
                return  # cut inside a keyword
            if not _SECTION.fullmatch(word):
                shown = word[:20].decode("latin-1")
                raise _damaged(f"{shown!r} stands outside a section", source, match.start())
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
    size = _SIZE.fullmatch(words[1]) if len(words) > 1 else None
    if size:  # of a port (18.4.2)
        words = [words[0], b"%d" % (abs(int(size[1]) - int(size[2])) + 1), *words[2:], words[1]]
    if len(words) < 4 or not words[1].isdigit() or not 0 < len(words[1]) < 10:
        shown = b" ".join(words)[:30].decode("latin-1")
        raise _damaged(f"variable {shown!r}", source, 0)
    kind, width, code = words[0].decode("latin-1"), int(words[1]), words[2]
    reference = " ".join(word.decode("latin-1") for word in words[3:])
    name, bits = _bits(reference, width, real=kind in REALS)
    clean = "".join(c for c in name if c.isprintable())
    return Variable(code=code, kind=kind, width=width, scope=scope, name=clean, bits=bits)


def _bits(reference: str, width: int, *, real: bool) -> tuple[str, tuple[int, ...]]:
    """Return the name without its range, and the index of each bit."""
    match = None if real else _RANGE.fullmatch(reference)
    if match and match[3] is None:
        return f"{match[1]}[{match[2]}]", ()
    name, bits = reference, range(0)
    if match:
        name, high, low = match[1], int(match[2]), int(match[3])
        bits = range(high, low - 1, -1) if high >= low else range(high, low + 1)
    if width > 1 and len(bits) != width:
        bits = range(width - 1, -1, -1)
    return name, tuple(bits) if width <= WIDEST else ()


def full_path(variable: Variable) -> str:
    """Return the dotted name with all its scopes."""
    return ".".join((*variable.scope, variable.name))


def shared_scope(variables: list[Variable]) -> tuple[str, ...]:
    """Return the scopes that all variables share."""
    scopes = [v.scope for v in variables]
    shared = 0
    while scopes and all(len(s) > shared and s[shared] == scopes[0][shared] for s in scopes):
        shared += 1
    return scopes[0][:shared] if scopes else ()


def trace_names(variables: list[Variable]) -> dict[Variable, str]:
    """Return dotted names, without the scopes that all variables share.

    Where different variables have one name, each gets its number behind it.
    """
    shared = len(shared_scope(variables))
    names = {v: ".".join((*v.scope[shared:], v.name)) for v in variables}
    codes: dict[str, list[bytes]] = {}
    for variable, name in names.items():
        of_name = codes.setdefault(name, [])
        if variable.code not in of_name:
            of_name.append(variable.code)
    return {
        v: name if len(codes[name]) == 1 else f"{name} ({codes[name].index(v.code) + 1})"
        for v, name in names.items()
    }


def find_variable(
    variables: list[Variable], names: dict[Variable, str], asked: str
) -> Variable | None:
    """Return the one variable called ``asked``: by its path, by its trace's name, by its own."""
    for called in (full_path, names.__getitem__, lambda v: v.name):
        found = [v for v in variables if called(v) == asked]
        if len(found) == 1:
            return found[0]
    return None
