"""What went wrong on a stream: each mishap with its place, and what is said of them."""

from __future__ import annotations

from collections import Counter, deque
from collections.abc import Iterable, Iterator
from typing import Literal

from benchtool.frozen import frozen_record
from benchtool.model.quantity import Notice

Kind = Literal[
    "lost", "level", "back", "repeated", "garbage", "restart", "silent", "overrun", "header"
]

GAPS: frozenset[Kind] = frozenset({"lost", "level", "restart", "silent", "overrun"})
"""Kinds that part the record by themselves."""

_MOST = 1024


@frozen_record
class Mishap:
    """Something that went wrong.

    Attributes:
        kind: What.
        tick: Where, in ticks since the first line.
        n: How many edges were lost, or how many lines it is about.
        line: Number of the first line it is about, 0 where none.
        text: That line, where it could not be read.
    """

    kind: Kind
    tick: int
    n: int = 1
    line: int = 0
    text: str = ""


class MishapList:
    """The mishaps of a stretch; the oldest of many are counted together."""

    def __init__(self) -> None:
        self._held: deque[Mishap] = deque()

    def add(self, mishap: Mishap) -> None:
        """Append a mishap."""
        held = self._held
        if held and mishap.kind in ("garbage", "repeated") and held[-1].kind == mishap.kind:
            last = held.pop()
            mishap = _joined(last, mishap)
        held.append(mishap)
        if len(held) > _MOST:
            self._merge_oldest()

    def forget_before(self, tick: int) -> None:
        """Drop what lies before a time."""
        while self._held and self._held[0].tick < tick:
            self._held.popleft()

    def __iter__(self) -> Iterator[Mishap]:
        return iter(self._held)

    def _merge_oldest(self) -> None:
        """Join the oldest mishap with the next of its kind."""
        oldest = self._held.popleft()
        for i, other in enumerate(self._held):
            if other.kind == oldest.kind:
                self._held[i] = _joined(oldest, other)
                return


def _joined(first: Mishap, second: Mishap) -> Mishap:
    return Mishap(
        kind=first.kind,
        tick=second.tick,
        n=first.n + second.n,
        line=first.line,
        text=first.text,
    )


def notices(mishaps: Iterable[Mishap]) -> tuple[Notice, ...]:
    """Return one notice a kind, with how often it happened and where first."""
    counts: Counter[Kind] = Counter()
    times: Counter[Kind] = Counter()
    first: dict[Kind, Mishap] = {}
    for mishap in mishaps:
        counts[mishap.kind] += mishap.n
        times[mishap.kind] += 1
        first.setdefault(mishap.kind, mishap)
    return tuple(
        _notice(kind, counts[kind], times[kind], first[kind]) for kind in _TEXTS if kind in first
    )


def _notice(kind: Kind, n: int, n_times: int, first: Mishap) -> Notice:
    code, text = _TEXTS[kind]
    shown = f", '{first.text}'" if first.text else ""
    where = f"; first at line {first.line}{shown}" if first.line else ""
    if n == 1:
        for many, one in _SINGULAR:
            text = text.replace(many, one)
    return Notice(code=code, text=text.format(n=n, times=n_times) + where)


_SINGULAR = (
    (" edges were", " edge was"),
    (", at {times} places", ""),
    ("; the record has a gap at each", "; the record has a gap there"),
    ("{n} times", "once"),
    (" lines came", " line came"),
    (" lines", " line"),
    (" were left", " was left"),
)
_GAP = "; the record has a gap at each"
_TEXTS: dict[Kind, tuple[str, str]] = {
    "lost": ("stream-lost", "{n} edges were lost on the way, at {times} places" + _GAP),
    "level": ("stream-level", "{n} times two edges in a row led to the same level" + _GAP),
    "garbage": ("stream-garbage", "{n} lines could not be read and were left out"),
    "back": ("stream-time-back", "{n} lines, whose time lies before the last, were left out"),
    "repeated": ("stream-repeated", "{n} lines came again and were left out"),
    "restart": ("stream-restart", "{n} times the device began anew" + _GAP),
    "silent": ("stream-silent", "{n} times no line came for over half a turn of the ticks" + _GAP),
    "overrun": ("stream-overrun", "{n} times more came than was taken" + _GAP),
    "header": ("stream-header", "{n} header lines could not be used"),
}
