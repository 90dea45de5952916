"""Where each key of a TOML text stands.

The reader of the standard library keeps no positions. So the text is read statement by statement:
lines are gathered until they parse on their own, which is where a statement ends.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any

Path = tuple[str | int, ...]
"""Keys and list indices from the root to a value."""


_MAY_END = re.compile(r"[\]}]|\"\"\"|'''")  # what the last line of a longer statement must hold
_MOST_ROWS = 200  # of a list whose items are placed one by one


@dataclass(slots=True)
class _Index:
    """Lines by path while the text is walked; the header of a table wins over its first mention."""

    lines: dict[Path, int] = field(default_factory=dict)
    table: Path = ()
    n_entries: dict[Path, int] = field(default_factory=dict)

    def add(self, path: Path, line: int) -> None:
        self.lines.setdefault(path, line)


def find_lines(text: str) -> Mapping[Path, int]:
    r"""Return the line, from 1, on which each key, table and list item begins.

    Args:
        text: Valid TOML.

    Example:
        >>> find_lines('[board]\nname = "Mist"')[("board", "name")]
        2
    """
    index = _Index()
    for first, statement in _statements(text):
        if statement.lstrip().startswith("["):
            _add_header(index, statement, first)
        else:
            _add_values(index, statement, first)
    return index.lines


def line_of(path: Path, lines: Mapping[Path, int]) -> int | None:
    """Return the line of a path, or of the nearest table above it that the text has."""
    for n in range(len(path), 0, -1):
        if path[:n] in lines:
            return lines[path[:n]]
    return None


def _statements(text: str) -> Iterator[tuple[int, str]]:
    """Yield each statement with the number of its first line; blank lines and comments fall out."""
    gathered: list[str] = []
    first = 1
    for number, line in enumerate(text.replace("\r\n", "\n").split("\n"), start=1):
        if not gathered and (not line.strip() or line.lstrip().startswith("#")):
            continue
        first = first if gathered else number
        gathered.append(line)
        if len(gathered) > 1 and not _MAY_END.search(line):
            continue
        statement = "\n".join(gathered)
        if _parsed(statement) is not None:
            yield first, statement
            gathered = []


def _parsed(text: str) -> dict[str, Any] | None:
    try:
        return tomllib.loads(text)
    except ValueError:
        return None


def _add_header(index: _Index, statement: str, line: int) -> None:
    """Enter ``[a.b]`` or ``[[a.b]]`` and note its line."""
    keys: list[str] = []
    node: Any = _parsed(statement)
    while isinstance(node, dict) and node:
        key, node = next(iter(node.items()))
        keys.append(key)
    path = _entered(index, keys)
    if isinstance(node, list):
        number = index.n_entries.get(path, 0)
        index.n_entries[path] = number + 1
        index.add(path, line)
        path = (*path, number)
    for n in range(1, len(path)):
        index.add(path[:n], line)
    index.lines[path] = line
    index.table = path


def _entered(index: _Index, keys: list[str]) -> Path:
    """Return the path of a header's keys, inside the latest entry of any list on the way."""
    path: Path = ()
    for key in keys:
        if path in index.n_entries:
            path = (*path, index.n_entries[path] - 1)
        path = (*path, key)
    return path


def _add_values(index: _Index, statement: str, first: int) -> None:
    for path in _paths(_parsed(statement) or {}, ()):
        index.add((*index.table, *path), first)
    if 0 < statement.count("\n") < _MOST_ROWS:
        _add_items(index, statement, first)


def _add_items(index: _Index, statement: str, first: int) -> None:
    """Move the items of a list over several lines to the line on which each begins."""
    rows = statement.split("\n")
    seen: set[Path] = set(_paths(_parsed(f"{rows[0]}\n]") or {}, ()))
    for n in range(2, len(rows) + 1):
        part = _parsed("\n".join([*rows[:n], "]"])) or {}
        for path in _paths(part, ()):
            if seen and path not in seen:
                index.lines[(*index.table, *path)] = first + n - 1
                seen.add(path)


def _paths(node: object, path: Path) -> Iterator[Path]:
    if path:
        yield path
    items = node.items() if isinstance(node, dict) else ()
    for key, value in enumerate(node) if isinstance(node, list) else items:
        yield from _paths(value, (*path, key))
