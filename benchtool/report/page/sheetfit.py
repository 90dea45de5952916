"""The size of print at which a page stays on one sheet, from how much it has to say.

Heights are estimated from the count of characters, on the narrower and on the lower of the two
papers at once (A4 is narrower, Letter lower), with letters taken a little wider than they are.
Lengths are in em of the root size of print, which the style sheet scales everything by.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Sequence
from typing import Any

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
    Sheet,
    Verdict,
)

_WIDTH_MM, _HEIGHT_MM = 186.0, 261.0  # A4 and Letter less the margins of the style sheet
_LARGEST_PT, _SMALLEST_PT, _STEP_PT = 9.0, 6.6, 0.1
_MM_PER_PT = 25.4 / 72
_BODY, _LINE = 0.875, 0.875 * 1.36  # size of text, height of its lines
_CHAR = 0.5 * _BODY  # width of a letter
_HEADING = 2.2  # of a section, with the gap above it
_LABEL = 6.0  # of the names of facts
_COLUMNS = 3
_COMPASS = 14.0  # height of the drawing, as the style sheet has it
_IN_COLUMNS = {"more", "conditions", "quality", "traceability", "rule", "cautions"}


def print_size_pt(page: Page) -> float:
    """Return the root size of print in points.

    Args:
        page: What is to be printed; of several stages each has a sheet of its own.
    """
    sheets = page.sheets
    closing = page.closing if len(sheets) == 1 else ()
    steps = round((_LARGEST_PT - _SMALLEST_PT) / _STEP_PT)
    for step in range(steps):
        size_pt = round(_LARGEST_PT - step * _STEP_PT, 1)
        if all(_height_mm(page, sheet, closing, size_pt) <= _HEIGHT_MM for sheet in sheets):
            return size_pt
    return _SMALLEST_PT


def _height_mm(page: Page, sheet: Sheet, closing: Sequence[Section], size_pt: float) -> float:
    em_mm = size_pt * _MM_PER_PT
    width = _WIDTH_MM / em_mm
    sections = [*sheet.sections, *closing]
    left, right = page.title + page.subtitle, page.source + page.made
    fits = (len(left + right) + 8) * _CHAR < width
    head = _LINE if fits else _wrapped((left, right), width)
    verdicts = _verdict(sheet.verdict, width)
    if len(page.sheets) > 1:
        verdicts += _verdict(page.verdict, width)
    return (head + verdicts + _sections(sections, width)) * em_mm


def _verdict(verdict: Verdict, width: float) -> float:
    return 4.4 + math.ceil(len(verdict.sentence) * 0.5 * 1.1 / width) * 1.1 * 1.3


def _sections(sections: Iterable[Section], width: float) -> float:
    """Return the height of sections, those in columns shared among the columns."""
    full, shared = 0.0, []
    for section in sections:
        if section.key in _IN_COLUMNS:
            shared += _pieces(section, width / _COLUMNS - 1.6)
        else:
            full += _section(section, width)
    return full + _balanced(shared, _COLUMNS)


def _pieces(section: Section, width: float) -> list[float]:
    """Return the heights of what must stay together: notes may part, all else may not."""
    if section.key != "quality":
        return [_section(section, width)]
    notes = [block for block in section.blocks if isinstance(block, Notes)]
    others = [_block(block, width) for block in section.blocks if not isinstance(block, Notes)]
    texts = [note for block in notes for note in block.notes]
    return [_HEADING + sum(others), *(_block(Notes(notes=(note,)), width) for note in texts)]


def _balanced(heights: Sequence[float], n_columns: int) -> float:
    """Return the least height at which pieces go whole and in order into so many columns."""
    if n_columns == 1:
        return sum(heights)
    return min(
        max(sum(heights[:stop]), _balanced(heights[stop:], n_columns - 1))
        for stop in range(len(heights) + 1)
    )


def _section(section: Section, width: float) -> float:
    if section.key != "circuit":
        return _HEADING + sum(_block(block, width) for block in section.blocks)
    prose = [_block(block, width) for block in section.blocks if isinstance(block, Prose)]
    others = [_block(block, width) for block in section.blocks if not isinstance(block, Prose)]
    return _HEADING + sum(prose) + max(others, default=0.0)  # products and parts: side by side


def _block(block: Block, width: float) -> float:
    return _HEIGHTS[block.kind](block, width)


def _facts(block: Facts, width: float) -> float:
    return sum(_wrapped((said,), width - _LABEL) for _, said in block.rows)


def _lines(block: Lines, _width: float) -> float:
    return math.ceil(len(block.lines) / 3) * (_LINE + 2.3) + _LINE


def _pictures(_block: Pictures, width: float) -> float:
    return (width - 2.8) * 1.45 / 8.1 + _LINE


def _notes(block: Notes, width: float) -> float:
    texts = (f"{note.word} {note.text} {note.code}" for note in block.notes)
    return sum(_wrapped((text,), width) + 0.2 for text in texts)


def _wrapped(paragraphs: Iterable[str], width: float) -> float:
    """Return the height of paragraphs, each on lines of its own."""
    return _LINE * sum(
        max(1, math.ceil(len(text) * _CHAR / max(width, 1.0))) for text in paragraphs
    )


def _grid(block: Grid, width: float) -> float:
    """Return the height of a table: figures keep to one line, the other columns share the rest."""
    names = block.names or ("",) * len(block.rows)
    rows = [(f"{row[0]} {name}", *row[1:]) for name, row in zip(names, block.rows, strict=True)]
    natural = [max(map(len, column)) * _CHAR + 0.9 for column in zip(*rows, strict=True)]
    kept = block.numeric | ({len(natural) - 1} if block.verdicts else set())
    free = [i for i in range(len(natural)) if i not in kept]
    rest = width - sum(natural[i] for i in kept)
    shrunk = min(1.0, rest / sum(natural[i] for i in free))
    lines = (max(_wrapped((row[i],), natural[i] * shrunk) for i in free) for row in rows)
    return _LINE + 0.3 + sum(height + 0.3 for height in lines)


_HEIGHTS: dict[str, Callable[[Any, float], float]] = {
    Prose.kind: lambda block, width: _wrapped((block.text,), width),
    Facts.kind: _facts,
    Grid.kind: _grid,
    Lines.kind: _lines,
    Pictures.kind: _pictures,
    Bars.kind: lambda block, _width: (len(block.rows) + 1) * (_LINE + 0.3),
    Compass.kind: lambda _block, _width: _COMPASS,
    Notes.kind: _notes,
    Command.kind: lambda block, width: _wrapped((block.text,), width / 1.15) + 0.5,
}
