"""The page as plain text, 78 columns wide."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from textwrap import wrap
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

_WIDTH = 78
_INDENT = "  "
_GAP = 2  # between the columns of a table


def write_page(page: Page) -> str:
    """Return the page as plain text.

    Args:
        page: What it shows; any text in it may come from a hostile file.
    """
    rows = [*_head(page)]
    alone = len(page.sheets) == 1
    if not alone:
        rows += _verdict(page.verdict, f"{page.verdict.of_all}: ")
    for sheet in page.sheets:
        if not alone:
            rows += ["=" * _WIDTH, *_wrapped(sheet.title, ""), ""]
        rows += _verdict(sheet.verdict)
        rows += _sections(sheet.sections)
    rows += [] if alone else ["=" * _WIDTH, ""]
    rows += _sections(page.closing)
    return "\n".join(row.rstrip() for row in rows).rstrip() + "\n"


def _head(page: Page) -> list[str]:
    about = f"{page.title}  {page.subtitle}".rstrip()
    source = [] if page.source == page.title else _wrapped(page.source, "")
    return [*_wrapped(about, ""), *source, *_wrapped(page.made, ""), "=" * _WIDTH, ""]


def _verdict(verdict: Verdict, about: str = "") -> list[str]:
    return [f"{about}{verdict.word.upper()}", *_wrapped(verdict.sentence, ""), ""]


def _sections(sections: Iterable[Section]) -> list[str]:
    rows = []
    for section in sections:
        rows += [section.title, "-" * len(section.title)]
        for block in section.blocks:
            rows += [*_block(block), ""]
    return rows


def _block(block: Block) -> list[str]:
    return _WRITERS[block.kind](block)


def _lines(block: Lines) -> list[str]:
    return [_INDENT + row for row in (*line_rows(block.lines), *wrap(LEGEND, _WIDTH - 2))]


def _pictures(block: Pictures) -> list[str]:
    rows = picture_rows(block.result) or ["There is too little to draw."]
    return [_INDENT + row for row in rows]


def _bars(block: Bars) -> list[str]:
    rows = tuple((row.name, row.percent, row.meaning, row.size) for row in block.rows)
    return _grid(Grid(caption="", heads=BAR_HEADS, rows=rows, numeric=frozenset({1})))


def _notes(block: Notes) -> list[str]:
    texts = (f"{note.word}: {note.text} [{note.code}]" for note in block.notes)
    return [row for text in texts for row in _wrapped(text)]


def _command(block: Command) -> list[str]:
    return [_INDENT + printable(block.text)]


def _wrapped(text: str, indent: str = _INDENT, hanging: str | None = None) -> list[str]:
    """Return a paragraph in rows; names without a space are broken where they must be."""
    later = indent if hanging is None else hanging
    return wrap(printable(text), _WIDTH, initial_indent=indent, subsequent_indent=later) or [""]


def _facts(block: Facts) -> list[str]:
    width = max(len(name) for name, _ in block.rows) + _GAP
    rows = []
    for name, said in block.rows:
        lead = f"{_INDENT}{name:<{width}}"
        rows += _wrapped(said, lead, " " * len(lead))
    return rows


def _grid(block: Grid) -> list[str]:
    """Return a table in columns where they fit, else a paragraph for each row."""
    named = block.names or ("",) * len(block.rows)
    cells = [
        [printable(f"{row[0]}  {name}".rstrip()), *map(printable, row[1:])]
        for name, row in zip(named, block.rows, strict=True)
    ]
    widths = [max(map(len, column)) for column in zip(block.heads, *cells, strict=True)]
    if len(_INDENT) + sum(widths) + _GAP * (len(widths) - 1) <= _WIDTH:
        return [_columns(row, widths, block.numeric) for row in (block.heads, *cells)]
    return [line for row in cells for line in _record(block, row, widths)]


def _columns(row: Sequence[str], widths: Sequence[int], numeric: frozenset[int]) -> str:
    placed = [
        cell.rjust(width) if i in numeric else cell.ljust(width)
        for i, (cell, width) in enumerate(zip(row, widths, strict=True))
    ]
    return _INDENT + (" " * _GAP).join(placed)


def _record(block: Grid, row: Sequence[str], widths: Sequence[int]) -> list[str]:
    """Return a row as its first two cells and the verdict, with the others named below."""
    last = len(row) - 1 if block.verdicts else len(row)
    verdict = row[last] if block.verdicts else ""
    first = f"{_INDENT}{row[0]:<{widths[0] + _GAP}}{row[1]:<{widths[1] + _GAP}}{verdict}"
    said = [
        f"{head} {cell}"
        for head, cell in zip(block.heads[2:last], row[2:last], strict=True)
        if cell not in {"", "–"}
    ]
    return [first, *_wrapped("; ".join(said), _INDENT * 3)] if said else [first]


_WRITERS: dict[str, Callable[[Any], list[str]]] = {
    Prose.kind: lambda block: _wrapped(block.text),
    Facts.kind: _facts,
    Grid.kind: _grid,
    Lines.kind: _lines,
    Pictures.kind: _pictures,
    Bars.kind: _bars,
    Compass.kind: lambda block: [_INDENT + row for row in compass_rows(block.points)],
    Notes.kind: _notes,
    Command.kind: _command,
}
