"""What a value of a dialect file may be: each taker checks one, and notes what is wrong with it."""

from __future__ import annotations

import re
import string
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from typing import Any

from benchtool.designs.lines import Path
from benchtool.designs.vocabulary import listed, nearest
from benchtool.frozen import frozen_record

PLACEHOLDERS = ("channel", "start", "stop", "offset", "count", "n")
"""What may stand between braces in a command."""

_LARGEST_TEXT = 1000


@frozen_record
class Flaw:
    """A fault before its line is known."""

    path: Path
    message: str
    near: str | None = None


@dataclass(frozen=True, slots=True)
class Spot:
    """A place in the file, and the list that takes what is wrong there."""

    path: Path = ()
    flaws: list[Flaw] = field(default_factory=list)

    def at(self, step: str | int) -> Spot:
        """Return the spot one key or index further."""
        return Spot((*self.path, step), self.flaws)

    def wrong(self, message: str, near: str | None = None) -> None:
        """Note a fault here."""
        self.flaws.append(Flaw(path=self.path, message=message, near=near))


Taker = Callable[[Any, Spot], Any]
"""Returns the value as the record holds it, or notes a fault."""


def shown(value: object) -> str:
    """Return a value as a message quotes it."""
    words = {bool: str(value).lower(), list: "a list", dict: "a table"}
    text = words.get(type(value)) or (repr(value) if isinstance(value, str) else f"{value}")
    return text if len(text) <= 60 else text[:57] + "..."


def text(value: Any, spot: Spot) -> str:
    """Take a text."""
    if not isinstance(value, str):
        spot.wrong(f"{shown(value)} must be a text between quotes")
        return ""
    if len(value) > _LARGEST_TEXT:
        spot.wrong(f"is longer than {_LARGEST_TEXT} characters")
    return value


def some_text(value: Any, spot: Spot) -> str:
    """Take a text that is not empty."""
    if value == "":
        spot.wrong("must not be empty")
    return text(value, spot)


def name(value: Any, spot: Spot) -> str:
    """Take a name: letters, digits, dashes, no blanks."""
    if isinstance(value, str) and not re.fullmatch(r"[A-Za-z0-9][A-Za-z0-9_.-]{0,63}", value):
        spot.wrong(f"{shown(value)} must be letters, digits and dashes, without blanks")
    return text(value, spot)


def flag(value: Any, spot: Spot) -> bool:
    """Take true or false."""
    if not isinstance(value, bool):
        spot.wrong(f"{shown(value)} must be true or false, without quotes")
    return bool(value)


def whole(least: int, most: int = 1 << 40) -> Taker:
    """Return a taker of whole numbers from ``least`` to ``most``."""

    def take(value: Any, spot: Spot) -> int:
        if not isinstance(value, int) or isinstance(value, bool) or not least <= value <= most:
            spot.wrong(f"{shown(value)} must be a whole number from {least} to {most}")
            return least
        return value

    return take


def number(least: float, most: float = 1e9) -> Taker:
    """Return a taker of finite numbers from ``least`` to ``most``."""

    def take(value: Any, spot: Spot) -> float:
        numeric = isinstance(value, int | float) and not isinstance(value, bool)
        if not numeric or not least <= value <= most:
            spot.wrong(f"{shown(value)} must be a number from {least:g} to {most:g}")
            return least
        return float(value)

    return take


def choice(*known: str) -> Taker:
    """Return a taker of one of some words."""

    def take(value: Any, spot: Spot) -> str:
        if value not in known or not isinstance(value, str):
            near = nearest(value, known) if isinstance(value, str) else None
            spot.wrong(
                f"{shown(value)} is not known; it must be {listed(map(repr, known), 'or')}", near
            )
            return known[0]
        return value

    return take


def pattern(value: Any, spot: Spot) -> str:
    """Take a regular expression."""
    found = text(value, spot)
    try:
        re.compile(found)
    except re.error as error:
        spot.wrong(f"{shown(value)} is no regular expression: {error}")
    return found


def command(*allowed: str) -> Taker:
    """Return a taker of a command in printable ASCII; ``allowed`` may stand in braces."""

    def take(value: Any, spot: Spot) -> str:
        found = some_text(value, spot)
        if not (found.isascii() and found.isprintable()):
            spot.wrong(f"{shown(value)} must be printable ASCII, without line feeds")
        _check_placeholders(found, allowed, spot)
        return found

    return take


def placeholders_of(template: str) -> set[str]:
    """Return the names between braces, none where the braces do not match."""
    try:
        return {field for _, field, _, _ in string.Formatter().parse(template) if field is not None}
    except ValueError:
        return set()


def _check_placeholders(found: str, allowed: tuple[str, ...], spot: Spot) -> None:
    try:
        parts = list(string.Formatter().parse(found))
    except ValueError:
        spot.wrong(
            f"{shown(found)} has a brace without its partner; a plain brace is written twice"
        )
        return
    for _, key, form, conversion in parts:
        if key is None:
            continue
        if key not in allowed or form or conversion:
            may = (
                f"here {listed('{' + word + '}' for word in allowed)} may stand"
                if allowed
                else ("none may stand here")
            )
            spot.wrong(f"{{{key}}} is no placeholder here; {may}", nearest(key, allowed))


def query(*allowed: str) -> Taker:
    """Return a taker of one query: a question mark at the end of its header, no second command."""
    inner = command(*allowed)

    def take(value: Any, spot: Spot) -> str:
        found: str = inner(value, spot)
        if found and not re.fullmatch(r"[^\s?]+\?(\s.*)?", found):
            spot.wrong(f"{shown(value)} is no query: its header must end with a question mark")
        return found

    return take


def listing(taker: Taker, *, least: int = 0) -> Taker:
    """Return a taker of a list; a single value stands for a list of one."""

    def take(value: Any, spot: Spot) -> tuple[Any, ...]:
        if not isinstance(value, list):
            return (taker(value, spot),)
        if len(value) < least:
            spot.wrong("must not be empty")
        return tuple(taker(item, spot.at(n)) for n, item in enumerate(value))

    return take


def mapping(taker: Taker, *, known: Iterable[str] | None = None) -> Taker:
    """Return a taker of a table whose keys are free, or some of ``known``."""
    words = tuple(known) if known is not None else None

    def take(value: Any, spot: Spot) -> Mapping[str, Any]:
        if not isinstance(value, dict):
            spot.wrong(f"must be a table, not {shown(value)}")
            return {}
        for key in value:
            if words is not None and key not in words:
                spot.at(key).wrong("is no key known here", nearest(key, words))
        return {key: taker(item, spot.at(key)) for key, item in value.items()}

    return take


def either(*by_type: tuple[type | tuple[type, ...], Taker]) -> Taker:
    """Return a taker that goes by the type of the value; the last one takes what is left."""

    def take(value: Any, spot: Spot) -> Any:
        for kind, taker in by_type:
            if isinstance(value, kind):
                return taker(value, spot)
        return by_type[-1][1](value, spot)

    return take
