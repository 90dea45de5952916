"""The keys of a description, what each may be, and which go together."""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Iterator, Mapping
from typing import Any

from benchtool.designs.vocabulary import listed, nearest
from benchtool.frozen import frozen_record

Path = tuple[str | int, ...]
Check = Callable[[Any], str | None]
"""Returns what is wrong with a value, None where nothing is."""


@frozen_record
class Flaw:
    """What is wrong at a place of the file."""

    path: Path
    message: str
    near: str | None = None


@frozen_record
class Key:
    """A key: what its value may be, and whether it has to be there."""

    check: Check
    required: bool = False


def find_flaws(document: Mapping[str, Any]) -> list[Flaw]:
    """Return all that is wrong with a description."""
    flaws = list(_unknown_and_missing(document))
    return flaws or list(_conflicts(document))


def _unknown_and_missing(document: Mapping[str, Any]) -> Iterator[Flaw]:
    yield from _flaws_of_table((), document, {**_TOP, **dict.fromkeys(_TABLES, _TABLE)})
    for table in ("line", "time"):
        if table not in document:
            yield Flaw(path=(table,), message=f"is missing: a table [{table}]")
    for table, keys in _TABLES.items():
        found = document.get(table)
        if isinstance(found, dict):
            yield from _flaws_of_table((table,), found, keys)


def _flaws_of_table(
    path: Path, table: Mapping[str, Any], keys: Mapping[str, Key]
) -> Iterator[Flaw]:
    for name, value in table.items():
        if name not in keys:
            known = listed(sorted(keys))
            message = f"is no key known here; known are {known}"
            yield Flaw(path=(*path, name), message=message, near=nearest(name, keys))
        elif (wrong := keys[name].check(value)) is not None:
            yield Flaw(path=(*path, name), message=wrong)
    for name, key in keys.items():
        if key.required and name not in table:
            yield Flaw(path=(*path, name), message="is missing")


def _conflicts(document: Mapping[str, Any]) -> Iterator[Flaw]:
    """Yield what is wrong between keys that are each right."""
    line, time = document["line"], document["time"]
    columns = line["columns"]
    timed = [each for each in columns if each in ("time", "interval")]
    if len(timed) != 1:
        yield Flaw(path=("line", "columns"), message='needs either "time" or "interval", once')
    for name in ("seq", "level"):
        if columns.count(name) > 1:
            yield Flaw(path=("line", "columns"), message=f'has "{name}" more than once')
    if "seq_bits" in line and "seq" not in columns:
        yield Flaw(path=("line", "seq_bits"), message='needs a column "seq"')
    yield from _time_conflicts(time, has_interval="interval" in columns)
    yield from _level_conflicts(document, has_level="level" in columns)
    mark = line.get("delimiter", ",")
    if mark == time.get("decimal", "."):
        yield Flaw(path=("line", "delimiter"), message="is the decimal mark too")


def _time_conflicts(time: Mapping[str, Any], *, has_interval: bool) -> Iterator[Flaw]:
    ticks = time["unit"] == "ticks"
    if ticks and "tick_hz" not in time:
        yield Flaw(path=("time", "tick_hz"), message='is missing; unit = "ticks" needs it')
    for name in ("tick_hz", "wrap_bits"):
        if not ticks and name in time:
            yield Flaw(path=("time", name), message='belongs to unit = "ticks" alone')
    if ticks and "decimal" in time:
        yield Flaw(path=("time", "decimal"), message="does not belong to ticks, which are whole")
    if has_interval and "wrap_bits" in time:
        yield Flaw(path=("time", "wrap_bits"), message="does not belong to intervals")


def _level_conflicts(document: Mapping[str, Any], *, has_level: bool) -> Iterator[Flaw]:
    for table, wanted in (("level", has_level), ("edges", not has_level)):
        if wanted and table not in document:
            column = "a" if has_level else "no"
            message = f'is missing: a table [{table}], as there is {column} column "level"'
            yield Flaw(path=(table,), message=message)
        if not wanted and table in document:
            column = "no" if table == "level" else "a"
            message = f'does not belong here, as there is {column} column "level"'
            yield Flaw(path=(table,), message=message)
    level = document.get("level", {})
    if level and level["high"] == level["low"]:
        yield Flaw(path=("level", "low"), message="is the same as high")
    if level and level.get("of") is None and "interval" in document["line"]["columns"]:
        message = 'is missing: with intervals say whether the level is the one "before" or "after"'
        yield Flaw(path=("level", "of"), message=message)


def _one_of(*words: Any) -> Check:
    shown = listed([repr(word).replace("'", '"') for word in words], "or")

    def check(value: Any) -> str | None:
        right = any(value == word and type(value) is type(word) for word in words)
        return None if right else f"{value!r} is not known; it must be {shown}"

    return check


def _whole(least: int, most: int) -> Check:
    def check(value: Any) -> str | None:
        right = type(value) is int and least <= value <= most
        return None if right else f"{value!r} must be a whole number from {least} to {most}"

    return check


def _matching(pattern: str, words: str) -> Check:
    form = re.compile(pattern)

    def check(value: Any) -> str | None:
        right = isinstance(value, str) and form.fullmatch(value)
        return None if right else f"{value!r} must be {words}"

    return check


def _rate(value: Any) -> str | None:
    right = type(value) in (int, float) and math.isfinite(value) and value > 0
    return None if right else f"{value!r} must be a number above 0"


def _columns(value: Any) -> str | None:
    known = ("seq", "time", "interval", "level", "skip")
    if not isinstance(value, list) or not value:
        return 'must be a list, such as ["time", "level"]'
    for each in value:
        if each not in known:
            return f"{each!r} is no column; columns are {listed(known)}"
    return None


def _table(value: Any) -> str | None:
    return None if isinstance(value, dict) else "must be a table"


def _bits(value: Any) -> str | None:
    if value == 0 and type(value) is int:
        return None
    return _whole(8, 60)(value)


_TABLE = Key(check=_table)
_TOP = {
    "schema": Key(check=_one_of(1), required=True),
    "name": Key(check=_matching(r"[A-Za-z0-9-]{1,40}", "letters, digits and -"), required=True),
    "channel": Key(check=_matching(r"\S{1,40}", "a name without blanks")),
}
_TEXT = r"[!-~]{1,20}"
_TABLES = {
    "line": {
        "columns": Key(check=_columns, required=True),
        "delimiter": Key(
            check=_matching(r"[!-/:-@\[-`{-~]|tab|space", 'one mark such as ",", "tab" or "space"')
        ),
        "comment": Key(check=_matching(r"[!-~]{0,20}", "a few visible characters")),
        "header_lines": Key(check=_whole(0, 1000)),
        "seq_bits": Key(check=_bits),
    },
    "time": {
        "unit": Key(check=_one_of("ticks", "s", "ms", "us", "ns"), required=True),
        "tick_hz": Key(check=_rate),
        "wrap_bits": Key(check=_bits),
        "decimal": Key(check=_one_of(".", ",")),
    },
    "level": {
        "high": Key(check=_matching(_TEXT, "a few visible characters"), required=True),
        "low": Key(check=_matching(_TEXT, "a few visible characters"), required=True),
        "of": Key(check=_one_of("after", "before")),
    },
    "edges": {"first": Key(check=_one_of("rising", "falling"), required=True)},
}
