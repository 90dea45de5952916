"""Value changes word by word: every rule of IEEE 1364-2005, 18.2.1 and 18.4.3, and every fault."""

from __future__ import annotations

import math

from benchtool.errors import MalformedCaptureError
from benchtool.formats.vcd.changes import BIT_STATES, Body, extended

_HASH, _DOLLAR = b"#$"
_VALUES = frozenset(b"BbRrSs")
_PORTS = frozenset(b"pP")
_PORT_BITS = dict.fromkeys(b"DdLl0", 0) | dict.fromkeys(b"UuHh1", 1)
_PORT_BITS |= dict.fromkeys(b"NXZTxz?AaBbCcFf", -1)
_SILENT = frozenset({b"$end", b"$dumpon", b"$dumpall", b"$dumpvars", b"$dumpports",
                     b"$dumpportson", b"$dumpportsall", b"$vcdclose"})  # fmt: skip
_OFF = frozenset({b"$dumpoff", b"$dumpportsoff"})
_DECLARES = frozenset({b"$timescale", b"$scope", b"$var", b"$date", b"$version",
                       b"$enddefinitions"})  # fmt: skip
_MOST_TICKS = 2**63 - 1


class WordWalk:
    """Takes words of the body, in order, into a ``Body``."""

    def __init__(self, body: Body) -> None:
        self.body = body
        self.in_comment = False
        self._scalars = {code: bits[0] for code, bits in body.bits.items() if len(bits) == 1}

    def take(self, words: list[bytes], *, last: bool = False) -> list[bytes]:
        """Take words; return those of a value at their end whose code is yet to come.

        Args:
            words: Whole words, in order.
            last: Whether the file ends with them, perhaps in the middle of one.

        Raises:
            MalformedCaptureError: If times run backwards or a word is no value change.
        """
        at, scalars, states, body = 0, self._scalars, BIT_STATES, self.body
        try:
            while at < len(words):
                word = words[at]
                first = word[0]
                changes = scalars.get(word[1:]) if first in states else None
                if changes is not None and not self.in_comment:
                    changes.add(body.time, states[first])
                    at += 1
                    continue
                after = self._other(words, at)
                if after > len(words):
                    break
                at = after
        except _DamagedError:
            if not last:
                raise self._damage(words[at]) from None
        if last and at < len(words):
            body.cut = b" ".join(words[at:]).decode("latin-1")
            return []
        return words[at:]

    def _other(self, words: list[bytes], at: int) -> int:
        """Take a word that is no change of a wanted scalar; return where the next begins."""
        word = words[at]
        first = word[0]
        if self.in_comment:
            self.in_comment = word != b"$end"
        elif first in _VALUES:
            return self._pair(words, at)
        elif first in _PORTS:
            return self._port(words, at)
        elif first == _HASH:
            self._take_time(word)
        elif first == _DOLLAR:
            self._keyword(word)
        elif first in BIT_STATES and word[1:] in self.body.known:
            self._take_bits(word[1:], word[:1])
        else:
            raise _DamagedError
        return at + 1

    def _take_time(self, word: bytes) -> None:
        if not word[1:].isdigit() or len(word) > 40:
            raise _DamagedError
        time = int(word[1:])
        if self.body.start is None:
            self.body.start = time
        time -= self.body.start
        if not self.body.time <= time <= _MOST_TICKS:
            raise _DamagedError
        self.body.time = time

    def _keyword(self, word: bytes) -> None:
        if word == b"$comment":
            self.in_comment = True
        elif word in _OFF:
            self._forget()
        elif word not in _SILENT:
            raise _DamagedError

    def _forget(self) -> None:
        """Nothing is known of any variable from here on."""
        for bits in self.body.bits.values():
            for changes in bits:
                changes.add(self.body.time, -1)
        for each in (*self.body.reals.values(), *self.body.numbers.values()):
            each.add(self.body.time, math.nan)

    def _pair(self, words: list[bytes], at: int) -> int:
        """Take a value and the code in the word after it."""
        if at + 1 == len(words):
            return at + 2
        value, code = words[at], words[at + 1]
        if code not in self.body.known:
            raise _DamagedError
        if value[0] in b"Rr":
            self._take_real(code, value[1:])
        elif value[0] in b"Bb":
            self._take_bits(code, value[1:])
        return at + 2

    def _take_real(self, code: bytes, digits: bytes) -> None:
        try:
            value = float(digits)
        except ValueError:
            raise _DamagedError from None
        real = self.body.reals.get(code)
        if real is not None:
            real.add(self.body.time, value if math.isfinite(value) else math.nan)

    def _take_bits(self, code: bytes, digits: bytes) -> None:
        """Take the digits of a vector, most significant first."""
        bits = self.body.bits.get(code)
        if bits is None:
            return
        text = extended(digits.decode("latin-1"), len(bits))
        spare = text[: -len(bits)]
        if not digits or spare.strip(text[0] if text[0] in "xz" else "0"):
            raise _DamagedError
        states = [BIT_STATES.get(ord(digit)) for digit in text[-len(bits) :]]
        self._give(code, states)

    def _port(self, words: list[bytes], at: int) -> int:
        """Take the states of a port: states, strengths of 0 and of 1, code."""
        if at + 4 > len(words):
            return at + 4
        code = words[at + 3]
        if code not in self.body.known:
            raise _DamagedError
        bits = self.body.bits.get(code)
        if bits is not None:
            states = [_PORT_BITS.get(state) for state in words[at][1:]]
            if len(states) != len(bits):
                raise _DamagedError
            self._give(code, states)
        return at + 4

    def _give(self, code: bytes, states: list[int | None]) -> None:
        known = [state for state in states if state is not None]
        if len(known) != len(states):
            raise _DamagedError
        for changes, state in zip(self.body.bits[code], known, strict=True):
            changes.add(self.body.time, state)
        number = self.body.numbers.get(code)
        if number is not None:
            value = int("".join(map(str, known)), 2) if min(known) >= 0 else math.nan
            number.add(self.body.time, value)

    def _damage(self, word: bytes) -> MalformedCaptureError:
        body = self.body
        now = body.time + (body.start or 0)
        is_time = word[:1] == b"#" and word[1:].isdigit()
        backwards = is_time and len(word) < 40 and int(word[1:]) < now
        what, hint = "no value change:", "Save the capture again."
        if backwards:
            what = "time runs backwards at"
        elif is_time:
            what = "a time too far from the first:"
        elif word in _DECLARES:
            what, hint = "declarations begin anew with", "Split it there: it holds two dumps."
        return MalformedCaptureError(
            f"{body.source} is damaged, {what} {word[:30].decode('latin-1')!r} (after time {now})",
            hint=hint,
            path=body.source,
            code="time-disorder" if backwards else None,
        )


class _DamagedError(Exception):
    """A word that fits nowhere."""
