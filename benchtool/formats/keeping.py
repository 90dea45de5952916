"""Writing a structure down, so that files like this one are read the same way."""

from __future__ import annotations

import json
import re
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from benchtool.errors import UsageError
from benchtool.formats.content import Content
from benchtool.formats.kept import NONE, Match
from benchtool.formats.keptfiles import head_lines
from benchtool.model.capture import ReadOptions

_NAME = re.compile(r"[A-Za-z0-9_-]+")
_LONGEST_HEADER = 400


def check_name(name: str) -> None:
    """Refuse a name that could not be typed after ``--structure``.

    Raises:
        UsageError: If it is no word of letters, digits, dashes and underscores, or ``none``.
    """
    if not _NAME.fullmatch(name) or name.startswith("-") or name.casefold() == NONE:
        raise UsageError(
            f"{name!r} cannot name a structure",
            hint="Use letters, digits, - and _; none is taken: it applies no structure.",
        )


def match_of(content: Content, options: ReadOptions, format_name: str) -> Match:
    """Return what files like this one have in common: name, and header or number of columns.

    Args:
        content: The capture.
        options: What settles its structure.
        format_name: The format that reads it.
    """
    file = None if content.source == "-" else name_pattern(Path(content.source).name)
    if format_name != "text":
        return Match(file=file)
    from benchtool.formats.text.structure import find_structure

    structure = find_structure(content, options)
    rows = structure.heading.rows
    header = head_lines(content)[rows[0]].strip() if rows else ""
    if header and len(header) <= _LONGEST_HEADER:
        return Match(file=file, header=header)
    return Match(file=file, columns=structure.layout.n_fields)


def name_pattern(name: str) -> str:
    """Return a pattern for names that differ from this one in their numbers only.

    Example:
        >>> name_pattern("mist_0012.csv")
        'mist_*.csv'
    """
    stem, dot, suffix = name.removesuffix(".gz").rpartition(".")
    stem, suffix = (stem, dot + suffix) if stem else (dot + suffix, "")
    literal = re.sub(r"([*?[])", r"[\1]", stem)
    return re.sub(r"\d+", "*", literal) + suffix


def table_of(name: str, match: Match, settles: Mapping[str, Any]) -> str:
    """Return a structure as a TOML table."""
    conditions = {"file": match.file, "header": match.header, "columns": match.columns}
    told = [f"{key} = {_value(value)}" for key, value in conditions.items() if value is not None]
    lines = [f"[{name}]", *([f"match = {{ {', '.join(told)} }}"] if told else [])]
    for field, value in settles.items():
        key = field.removesuffix("_s")
        shown = f"{value!r}s" if field == "interval_s" else value
        lines.append(f"{key} = {_value(shown)}")
    return "\n".join(lines) + "\n"


def _value(value: object) -> str:
    if isinstance(value, int):
        return str(value)
    text = str(value).encode("utf-8", "replace").decode()
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")


def added(text: str, name: str, table: str) -> str:
    """Return the text of a file of structures with a table added, or put in another's place."""
    rest = _without(text, name).strip("\n")
    return f"{rest}\n\n{table}" if rest else table


def _without(text: str, name: str) -> str:
    """Return the text without a structure; all other lines stay as they are."""
    kept, inside = [], False
    for line in text.split("\n"):
        match = re.match(r"\s*\[\s*[\"']?([^\]\"'.]+?)[\"']?\s*[.\]]", line)
        if match:
            inside = match[1] == name
        if not inside:
            kept.append(line)
    return "\n".join(kept)
