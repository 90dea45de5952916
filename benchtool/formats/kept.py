"""Structures that a user named once and keeps: what a file of them says, and what it matches.

::

    [mist-logger]
    match = { file = "mist_*.csv", header = "t;OUT;CAP", columns = 3 }
    delimiter = ";"
    time_unit = "ms"

All of ``match`` must hold for a structure to apply by itself; one without ``match`` waits to be
named.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Mapping
from dataclasses import replace
from typing import Any

from benchtool.errors import UnitError, UsageError
from benchtool.formats.overrules import OPTIONS
from benchtool.formats.text.layout import DELIMITERS
from benchtool.frozen import frozen_record
from benchtool.model.capture import Capture, ReadOptions, StructurePoint
from benchtool.model.quantity import Notice

NONE = "none"
"""The name that applies no kept structure."""

_DELIMITERS = (",", ";", "\t", "|", " ")
_CHOICES = {"decimal": (".", ","), "time_unit": ("s", "ms", "us", "ns", "ps", "fs")}
_TEXTS = ("format", "delimiter", "time", "channel")
_KEYS = ("match", *_TEXTS, *_CHOICES, "interval", "rate", "skip")
_REPAIR = "Correct the file; --structure none reads captures without it."
_MATCH_KEYS = ("file", "header", "columns")


@frozen_record
class Match:
    """What a capture must look like; None is no condition.

    Attributes:
        file: Pattern of the file's name, such as ``mist_*.csv``.
        header: A whole line among the first ones.
        columns: Cells of most lines.
    """

    file: str | None = None
    header: str | None = None
    columns: int | None = None

    @property
    def words(self) -> str:
        """The conditions as evidence."""
        named = {"file": self.file, "header": self.header, "columns": self.columns}
        return ", ".join(f"{name} {value!r}" for name, value in named.items() if value is not None)


@frozen_record
class Kept:
    """One kept structure.

    Attributes:
        name: Its name.
        file: The file that holds it.
        match: When it applies by itself.
        settles: Fields of :class:`ReadOptions` to their values.
    """

    name: str
    file: str
    match: Match
    settles: tuple[tuple[str, Any], ...]

    @property
    def words(self) -> str:
        """How evidence names it."""
        return f"kept as {self.name} in {self.file}"


def read_kept(text: str, file: str) -> tuple[Kept, ...]:
    """Return the structures that a file keeps.

    Args:
        text: Its content.
        file: Its name, for messages.

    Raises:
        UsageError: At its first fault, with line, key and the nearest known key
            (``bad-kept-structure``).
    """
    import tomllib

    try:
        tables = tomllib.loads(text)
    except (tomllib.TOMLDecodeError, RecursionError) as error:
        reason = str(error) if isinstance(error, ValueError) else "it is nested too deeply"
        raise UsageError(
            f"{file} is no TOML: {reason}", hint=_REPAIR, code="bad-kept-structure"
        ) from None
    return tuple(_structure(name, table, _Place(text, file)) for name, table in tables.items())


class _Place:
    """Where a fault lies: makes the error for a key of a structure."""

    def __init__(self, text: str, file: str) -> None:
        self.file = file
        self._lines = text.split("\n")

    def fault(self, path: tuple[str, ...], message: str, known: Iterable[str] = ()) -> UsageError:
        """Return the error for the key at ``path``, with the nearest of the ``known`` ones."""
        from difflib import get_close_matches

        folded = path[-1].casefold().replace("-", "_")
        near = get_close_matches(folded, list(known), n=1, cutoff=0.5)
        hint = f"The nearest known key is {near[0]}." if near else ""
        hint = hint or (f"Known keys: {', '.join(known)}." if known else _REPAIR)
        where = f"{self.file}, line {self._line(path)}: {'.'.join(path)}"
        return UsageError(f"{where}: {message}", hint=hint, code="bad-kept-structure")

    def _line(self, path: tuple[str, ...]) -> int:
        """Return the first line by which the key is there: prefixes are parsed anew."""
        import tomllib

        for n in range(1, len(self._lines)):
            try:
                found: Any = tomllib.loads("\n".join(self._lines[:n]))
            except tomllib.TOMLDecodeError:
                continue
            for key in path:
                found = found.get(key) if isinstance(found, dict) else None
            if found is not None:
                return n
        return len(self._lines)


def _structure(name: str, table: Any, place: _Place) -> Kept:
    if not isinstance(table, dict):
        raise place.fault((name,), "stands outside of a structure: write [NAME] above it")
    if name.casefold() == NONE:
        raise place.fault((name,), "no structure can have this name: it applies none of them")
    settles: dict[str, Any] = {}
    for key, value in table.items():
        if key not in _KEYS:
            raise place.fault((name, key), "unknown key", _KEYS)
        if key != "match":
            settles |= _setting((name, key), value, place)
    if not settles:
        raise place.fault((name,), "settles nothing: say what the file does not", _KEYS[1:])
    if "interval" in table and "rate" in table:
        raise place.fault((name, "rate"), "says the same as interval: leave one of them")
    match = _match(name, table.get("match", {}), place)
    return Kept(name=name, file=place.file, match=match, settles=tuple(settles.items()))


def _setting(path: tuple[str, str], value: Any, place: _Place) -> dict[str, Any]:
    """Return the option that a key settles."""
    key = path[1]
    if key in ("interval", "rate"):
        return {"interval_s": _interval(path, value, place)}
    if key == "skip":
        return {key: _whole(path, value, 0, place)}
    if key == "time" and type(value) is int and value > 0:
        value = str(value)
    if not isinstance(value, str) or not value:
        raise place.fault(path, f"wants a text, got {value!r}")
    if key in _CHOICES and value not in _CHOICES[key]:
        raise place.fault(path, f"wants one of {' '.join(_CHOICES[key])}, got {value!r}")
    return {key: value}


def _interval(path: tuple[str, str], value: Any, place: _Place) -> float:
    from benchtool.units import parse

    try:
        figure = parse(str(value), "Hz" if path[1] == "rate" else "s")
    except UnitError as error:
        raise place.fault(path, error.message) from None
    if isinstance(value, bool) or not figure > 0:
        raise place.fault(path, f"must be greater than 0, got {value!r}")
    return 1 / figure if path[1] == "rate" else figure


def _whole(path: tuple[str, ...], value: Any, least: int, place: _Place) -> int:
    if type(value) is not int or value < least:
        raise place.fault(path, f"wants a whole number from {least} on, got {value!r}")
    return value


def _match(name: str, table: Any, place: _Place) -> Match:
    if not isinstance(table, dict):
        raise place.fault((name, "match"), 'wants a table, such as { file = "mist_*.csv" }')
    for key, value in table.items():
        path = (name, "match", key)
        if key not in _MATCH_KEYS:
            raise place.fault(path, "unknown key", _MATCH_KEYS)
        if key == "columns":
            _whole(path, value, 1, place)
        elif not isinstance(value, str) or not value:
            raise place.fault(path, f"wants a text, got {value!r}")
    return Match(**table)


def applies(kept: Kept, name: str, lines: list[str]) -> bool:
    """Say whether a structure applies to a capture by itself.

    Args:
        kept: The structure.
        name: File name of the capture, without its folder.
        lines: Its first lines.
    """
    from fnmatch import fnmatchcase

    match = kept.match
    if match == Match():
        return False
    if match.file is not None and not any(
        fnmatchcase(each, match.file) for each in (name, name.removesuffix(".gz"))
    ):
        return False
    header = match.header.strip() if match.header is not None else None
    if header is not None and header not in (line.strip() for line in lines):
        return False
    return match.columns is None or match.columns in _widths(lines, dict(kept.settles))


def _widths(lines: list[str], settles: Mapping[str, Any]) -> set[int]:
    """Return how many cells most lines have, under each delimiter that may be meant."""
    given = settles.get("delimiter")
    delimiters = _DELIMITERS if given is None else (DELIMITERS.get(given, given),)
    told = [line.strip() for line in lines[settles.get("skip", 0) :] if line.strip()]
    widths = set()
    for delimiter in delimiters:
        counts = Counter(_width(line, delimiter) for line in told)
        widths |= {width for width, _ in counts.most_common(1)}
    return widths


def _width(line: str, delimiter: str) -> int:
    if not delimiter:
        return 1
    return len(line.split() if delimiter == " " else line.split(delimiter))


def merged(options: ReadOptions, kept: Kept) -> tuple[ReadOptions, dict[str, str]]:
    """Return options with what a structure settles and the user did not say.

    Returns:
        The options, and the fields that came from the structure with the words for it.
    """
    added = {name: value for name, value in kept.settles if getattr(options, name) is None}
    return replace(options, **added), dict.fromkeys(added, f"kept as {kept.name}")


def said(capture: Capture, kept: Kept, used: Iterable[str], *, named: bool) -> Capture:
    """Return a capture that says which kept structure it was read as, and what that settled.

    Args:
        capture: As it was read.
        kept: The structure.
        used: What of it was used: options win over the rest.
        named: Whether the user named it; otherwise it applied by itself.
    """
    settles = shown({name: value for name, value in kept.settles if name in used})
    why = "--structure" if named else f"matches {kept.match.words}"
    point = StructurePoint(
        name="kept", value=kept.name, evidence=f"{kept.file}; {why}", sure="stated"
    )
    notice = Notice(
        code="kept-structure",
        text=f"{capture.origin.source} was read as {kept.name}, kept in {kept.file} "
        f"({settles or 'options win over all of it'}); --structure none reads it without",
    )
    return replace(
        capture,
        structure=(point, *capture.structure),
        warnings=(notice, *capture.warnings),
        channel=dict(kept.settles).get("channel"),
    )


def shown(settles: Mapping[str, Any]) -> str:
    """Return settings as a user would write them: ``--time-unit ms, --skip 3``."""
    return ", ".join(
        f"{OPTIONS[name].partition(' ')[0]} {f'{value:.9g}' if name == 'interval_s' else value}"
        for name, value in settles.items()
    )
