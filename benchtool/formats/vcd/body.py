"""Value changes of a dump (IEEE 1364-2005, 18.2.1), walked in blocks."""

from __future__ import annotations

from array import array
from collections.abc import Iterator
from dataclasses import dataclass, field

from benchtool.errors import MalformedCaptureError
from benchtool.formats.content import Content

_BLOCK = 1 << 18
_STATES = {48: 0, 49: 1, 120: -1, 88: -1, 122: -1, 90: -1}  # 0 1 x X z Z
_BIT = {"0": 0, "1": 1}
_HASH, _DOLLAR, _B, _b, _R, _r, _S, _s = b"#$BbRrSs"


@dataclass(slots=True)
class Changes:
    """The changes of one scalar, or of one bit of a vector: time counts and states."""

    times: array[int] = field(default_factory=lambda: array("q"))
    states: array[int] = field(default_factory=lambda: array("b"))


@dataclass(slots=True)
class RealChanges:
    """The changes of one real."""

    times: array[int] = field(default_factory=lambda: array("q"))
    values: array[float] = field(default_factory=lambda: array("d"))


@dataclass(slots=True)
class Body:
    """All changes of the wanted variables.

    Attributes:
        bits: Code to the changes of each bit, most significant first.
        reals: Code to the changes of a real.
        start: First time of the dump, None where it has none.
        end: Last time of the dump.
        cut: The words that a cut file ends in, if it does.
    """

    bits: dict[bytes, list[Changes]]
    reals: dict[bytes, RealChanges]
    start: int | None = None
    end: int = 0
    cut: str = ""


def read_body(content: Content, offset: int, body: Body, known: set[bytes]) -> None:
    """Walk the value changes from byte ``offset`` on and fill ``body``.

    Args:
        content: The file.
        offset: Where the changes begin.
        body: Its dictionaries name the wanted variables.
        known: Codes of all declared variables.

    Raises:
        MalformedCaptureError: If times run backwards or a word is no value change.
    """
    walk = _Walk(body, known, content.source)
    for words, last in _words(content, offset):
        walk.take(words, last=last)
    body.start = walk.start
    body.end = walk.time


def _words(content: Content, offset: int) -> Iterator[tuple[list[bytes], bool]]:
    """Yield whole words block by block, and whether the last may be cut."""
    rest = b""
    with content.open() as file:
        file.seek(offset)
        while block := file.read(_BLOCK):
            data = rest + block
            at = max(data.rfind(b"\n"), data.rfind(b"\r")) + 1
            rest = data[at:]
            if at:
                yield data[:at].split(), False
    yield rest.rstrip(b"\0").split(), True


class _Walk:
    """State of the walk: current time, and what an open word still needs."""

    def __init__(self, body: Body, known: set[bytes], source: str) -> None:
        self.body, self.known, self.source = body, known, source
        self.time = 0
        self.start: int | None = None
        self._vector: bytes | None = None
        self._comment = False
        self._scalars = {code: bits[0] for code, bits in body.bits.items() if len(bits) == 1}

    def take(self, words: list[bytes], *, last: bool) -> None:
        """Take the words of a block."""
        scalars, states = self._scalars, _STATES
        for word in words:
            first = word[0]
            if self._vector is None and not self._comment and first in states:
                changes = scalars.get(word[1:])
                if changes is not None:
                    changes.times.append(self.time)
                    changes.states.append(states[first])
                    continue
            try:
                self._other(word, first)
            except _DamagedError:
                if last:
                    self.body.cut = word.decode("latin-1")
                    return
                raise self._damage(word) from None
        if last and self._vector is not None:
            self.body.cut = self._vector.decode("latin-1")

    def _other(self, word: bytes, first: int) -> None:
        """Take a word that is no change of a wanted scalar."""
        if self._comment:
            self._comment = word != b"$end"
        elif self._vector is not None:
            vector, self._vector = self._vector, None
            self._take_vector(vector, word)
        elif first == _HASH:
            self._take_time(word)
        elif first in (_B, _b, _R, _r, _S, _s):
            self._vector = word
        elif first == _DOLLAR:
            self._keyword(word)
        elif first not in _STATES or (word[1:] not in self.known):
            raise _DamagedError

    def _take_time(self, word: bytes) -> None:
        if not word[1:].isdigit():
            raise _DamagedError
        time = int(word[1:])
        if time < self.time and self.start is not None:
            raise _DamagedError
        self.time = time
        if self.start is None:
            self.start = time
            self._move_start()

    def _move_start(self) -> None:
        """Values before the first time stand at that time."""
        bits = [changes for row in self.body.bits.values() for changes in row]
        for times in [c.times for c in bits] + [c.times for c in self.body.reals.values()]:
            for i in range(len(times)):
                times[i] = self.time

    def _keyword(self, word: bytes) -> None:
        if word == b"$comment":
            self._comment = True
        elif word == b"$dumpoff":
            self._forget()
        elif word not in (b"$end", b"$dumpon", b"$dumpall", b"$dumpvars"):
            raise _DamagedError

    def _forget(self) -> None:
        """Nothing is known of any variable from here on."""
        for bits in self.body.bits.values():
            for changes in bits:
                changes.times.append(self.time)
                changes.states.append(-1)

    def _take_vector(self, value: bytes, code: bytes) -> None:
        if code not in self.known:
            raise _DamagedError
        kind = value[0]
        if kind in (_R, _r):
            real = self.body.reals.get(code)
            if real is not None:
                real.times.append(self.time)
                real.values.append(_real(value))
            return
        bits = self.body.bits.get(code)
        if bits is None or kind in (_S, _s):
            return
        for changes, digit in zip(
            bits, extended(value[1:].decode("latin-1"), len(bits)), strict=True
        ):
            changes.times.append(self.time)
            changes.states.append(_BIT.get(digit, -1))

    def _damage(self, word: bytes) -> MalformedCaptureError:
        backwards = word[:1] == b"#" and word[1:].isdigit()
        what = "time runs backwards at" if backwards else "no value change:"
        return MalformedCaptureError(
            f"{self.source} is damaged, {what} {word[:30].decode('latin-1')!r} "
            f"(after time {self.time})",
            hint="Save the capture again.",
            path=self.source,
            code="time-disorder" if backwards else None,
        )


class _DamagedError(Exception):
    """A word that fits nowhere."""


def _real(value: bytes) -> float:
    try:
        return float(value[1:])
    except ValueError:
        raise _DamagedError from None


def extended(digits: str, width: int) -> str:
    """Return a vector value in full width.

    References:
        IEEE 1364-2005, table 18-1: a shorter value is extended on the left with 0 where it
        begins with 0 or 1, else with its first digit.
    """
    digits = digits.lower()
    fill = digits[:1] if digits[:1] in ("x", "z") else "0"
    return digits.rjust(width, fill)[-width:]
