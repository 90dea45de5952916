"""Reading the topic files and finding an entry in them.

A topic file is TOML: ``title`` and a row of ``[[entry]]`` tables with ``term``, ``title``,
``text``, ``source`` and, where they apply, ``aliases``, ``formula`` and ``see_also``. Lines of a
text are joined; a blank line parts paragraphs.
"""

from __future__ import annotations

import tomllib
from difflib import get_close_matches
from functools import cache
from importlib.resources import files
from typing import Any

from benchtool.frozen import frozen_record

_N_NEAREST = 3
_LIKENESS = 0.6


@frozen_record
class Entry:
    """One entry of the manual.

    Attributes:
        term: The word, code or figure name itself.
        aliases: Other ways to write it.
        title: What it is, a few words.
        topic: The heading it stands under.
        text: Plain language: what it means and what to do; paragraphs parted by a blank line.
        formula: The formula, one line each; empty where there is none.
        source: Where it comes from; facts of the trade are "common practice".
        see_also: Terms of related entries.
    """

    term: str
    aliases: tuple[str, ...]
    title: str
    topic: str
    text: str
    formula: str
    source: str
    see_also: tuple[str, ...]


def entries() -> tuple[Entry, ...]:
    """Return every entry, topic by topic."""
    return _entries()


def lookup(term: str) -> Entry | None:
    """Return the entry of a term or of one of its aliases, or None.

    Args:
        term: In any case; blanks, hyphens and underscores are alike, unless two entries differ in
            them alone (the term ``output_high_drop`` of an IC and the fault ``output-high-drop``).

    Example:
        >>> lookup("T high").term
        't_high'
    """
    index = _index()
    return index.get(term.strip().casefold()) or index.get(_folded(term))


def nearest(term: str) -> tuple[str, ...]:
    """Return up to three terms that look most like a word that is in no entry.

    Example:
        >>> nearest("gard band")[0]
        'guard band'
    """
    index = _index()
    close = get_close_matches(_folded(term), index, n=3 * _N_NEAREST, cutoff=_LIKENESS)
    return tuple(dict.fromkeys(index[key].term for key in close))[:_N_NEAREST]


def _folded(term: str) -> str:
    """Unify case and joints, but keep apart ``level`` and the option ``--level``."""
    bare = term.strip().casefold()
    words = bare.replace("_", " ").replace("-", " ").split()
    return ("--" if bare.startswith("--") else "") + "-".join(words)


@cache
def _entries() -> tuple[Entry, ...]:
    topics = sorted(
        (item for item in files("benchtool.manual").joinpath("topics").iterdir()),
        key=lambda item: item.name,
    )
    return tuple(
        _entry(table, topic["title"])
        for path in topics
        if path.name.endswith(".toml")
        for topic in [tomllib.loads(path.read_text(encoding="utf-8"))]
        for table in topic["entry"]
    )


@cache
def _index() -> dict[str, Entry]:
    names = [(name, entry) for entry in _entries() for name in (entry.term, *entry.aliases)]
    exact = {name.casefold(): entry for name, entry in names}
    return {_folded(name): entry for name, entry in names} | exact


def _entry(table: dict[str, Any], topic: str) -> Entry:
    return Entry(
        term=table["term"],
        aliases=tuple(table.get("aliases", ())),
        title=table["title"],
        topic=topic,
        text=_paragraphs(table["text"]),
        formula=table.get("formula", "").strip("\n"),
        source=table["source"],
        see_also=tuple(table.get("see_also", ())),
    )


def _paragraphs(text: str) -> str:
    return "\n\n".join(" ".join(block.split()) for block in text.strip().split("\n\n"))
