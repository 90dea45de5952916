"""The page as Markdown."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Sequence
from typing import Any

from benchtool.report.numberline import LEGEND
from benchtool.report.page.strips import BAR_HEADS, compass_rows, line_rows, picture_rows
from benchtool.report.page.views import (
    Bars,
    Block,
    Command,
    Compass,
    Facts,
    Grid,
    Lines,
    Notes,
    Page,
    Pictures,
    Prose,
    Section,
    Verdict,
)
from benchtool.report.text import printable

_ACTIVE = re.compile(r"([\\`*_\[\]<>&|~$#])")  # what could begin markup anywhere in a line


def write_page(page: Page) -> str:
    """Return the page as Markdown with tables, as the common dialects read it.

    Args:
        page: What it shows; any text in it may come from a hostile file.
    """
    alone = len(page.sheets) == 1
    rows = [*_head(page)]
    if not alone:
        rows += _verdict(page.verdict, f"{page.verdict.of_all}: ")
    for sheet in page.sheets:
        rows += [] if alone else [f"## {_escaped(sheet.title)}", ""]
        rows += _verdict(sheet.verdict)
        rows += _sections(sheet.sections)
    rows += [] if alone else ["## All of it", ""]
    rows += _sections(page.closing)
    return "\n".join(rows).rstrip() + "\n"


def _head(page: Page) -> list[str]:
    about = _escaped(f"{page.title} · {page.subtitle}" if page.subtitle else page.title)
    source = "" if page.source == page.title else f"{_escaped(page.source)}, "
    return [f"# {about}", "", f"{source}{_escaped(page.made)}", ""]


def _verdict(verdict: Verdict, about: str = "") -> list[str]:
    return [f"**{about}{verdict.word.upper()}**", "", _escaped(verdict.sentence), ""]


def _sections(sections: Iterable[Section]) -> list[str]:
    rows = []
    for section in sections:
        rows += [f"### {section.title}", ""]
        for block in section.blocks:
            rows += [*_block(block), ""]
    return rows


def _block(block: Block) -> list[str]:
    return _WRITERS[block.kind](block)


def _facts(block: Facts) -> list[str]:
    return _table(("", ""), ((name, _escaped(said)) for name, said in block.rows))


def _pictures(block: Pictures) -> list[str]:
    rows = picture_rows(block.result)
    return _fenced(rows) if rows else ["There is too little to draw."]


def _bars(block: Bars) -> list[str]:
    rows = ([_escaped(cell) for cell in (r.name, r.percent, r.meaning, r.size)] for r in block.rows)
    return _table(BAR_HEADS, rows, frozenset({1}))


def _notes(block: Notes) -> list[str]:
    return [f"- **{note.word}** {_escaped(note.text)} `{note.code}`" for note in block.notes]


def _escaped(text: str) -> str:
    """Return text that is shown as it is: nothing in it acts as markup."""
    return _ACTIVE.sub(r"\\\1", printable(text))


def _fenced(rows: Sequence[str], language: str = "text") -> list[str]:
    """Return rows as they are, inside a fence longer than any they hold."""
    runs = (len(run) for row in rows for run in re.findall("`+", row))
    fence = "`" * max(3, 1 + max(runs, default=0))
    return [f"{fence}{language}", *(row.rstrip() for row in rows), fence]


def _grid(block: Grid) -> list[str]:
    names = block.names or ("",) * len(block.rows)
    rows = (
        (_named(row[0], name), *_called(row[1:], bold=bool(block.verdicts)))
        for name, row in zip(names, block.rows, strict=True)
    )
    return _table(block.heads, rows, block.numeric)


def _named(label: str, name: str) -> str:
    return f"{_escaped(label)} `{name}`" if name else _escaped(label)


def _called(cells: Sequence[str], *, bold: bool) -> list[str]:
    """Return the cells, the verdict in the last one in bold."""
    shown = [_escaped(cell) for cell in cells]
    if bold and shown[-1]:
        shown[-1] = f"**{shown[-1]}**"
    return shown


def _table(
    heads: Sequence[str], rows: Iterable[Sequence[str]], numeric: frozenset[int] = frozenset()
) -> list[str]:
    rule = ["--:" if i in numeric else "---" for i in range(len(heads))]
    return [f"| {' | '.join(row)} |" for row in (heads, rule, *rows)]


_WRITERS: dict[str, Callable[[Any], list[str]]] = {
    Prose.kind: lambda block: [_escaped(block.text)],
    Facts.kind: _facts,
    Grid.kind: _grid,
    Lines.kind: lambda block: _fenced((*line_rows(block.lines), LEGEND)),
    Pictures.kind: _pictures,
    Bars.kind: _bars,
    Compass.kind: lambda block: _fenced(compass_rows(block.points)),
    Notes.kind: _notes,
    Command.kind: lambda block: _fenced([printable(block.text)], "sh"),
}
