"""The blocks that screens are made of."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from itertools import zip_longest

from rich.console import Console
from rich.text import Text

from benchtool.model.judgement import VerdictName
from benchtool.model.quantity import Notice
from benchtool.model.result import Analysis, StageResult
from benchtool.report.phrases import VERDICT_STYLES
from benchtool.report.screen.letters import large
from benchtool.report.text import printable, spelled

INDENT = 2
_GUTTER = 2
_LEAST_ROOM = 20


def draw_heading(console: Console, left: str, right: str) -> None:
    """Draw the top line: what it is about, and the file at the right edge or below it."""
    about, name = Text(printable(left), style="bold"), Text(printable(right), style="dim")
    console.print()
    room = console.width - 2 * INDENT - about.cell_len - name.cell_len
    if not name:
        _put(console, about)
    elif room >= 2:
        _put(console, Text.assemble(about, " " * room, name))
    else:
        _put(console, about)
        _put(console, name)


def draw_line(console: Console, text: str, style: str = "", *, deeper: int = 0) -> None:
    """Draw one indented paragraph, wrapped to the width."""
    _put(console, Text(printable(text), style=style), deeper)


def _put(console: Console, content: Text, deeper: int = 0) -> None:
    """Print text wrapped between the indents, no line ending in blanks."""
    indent = " " * (INDENT + deeper)
    for row in _shown(console, content).wrap(
        console, max(console.width - INDENT - len(indent), _LEAST_ROOM)
    ):
        _print_row(console, Text.assemble(indent, row))


def _shown(console: Console, content: Text) -> Text:
    """Return text with nothing in it that acts, in characters that the terminal has."""

    def shown(text: str) -> str:
        return spelled(printable(text), console.encoding)

    if shown(content.plain) == content.plain:
        return content
    parts = content.render(console, end="")
    return Text.assemble(*((shown(part.text), part.style or "") for part in parts))


def draw_title(console: Console, word: str, style: str, rest: str) -> None:
    """Draw a word in a style of its own, and what it is about beside it."""
    line = Text.assemble((printable(word), style), f"   {printable(rest)}" if rest else "")
    _put(console, line)


def draw_verdict(console: Console, verdict: VerdictName, sentence: str) -> None:
    """Draw the verdict in large letters, with one sentence below it."""
    style = VERDICT_STYLES[verdict]
    console.print()
    in_blocks = console.is_terminal and console.encoding.lower().startswith("utf")
    for row in large(verdict) if in_blocks else (verdict.upper(),):
        _put(console, Text(row, style=style))
    console.print()
    draw_line(console, sentence)


def draw_rows(
    console: Console, rows: Iterable[Sequence[str]], *, heads: Sequence[str] = ()
) -> None:
    """Draw aligned columns; the last one wraps under itself."""
    lines = [tuple(_shown(console, Text(cell)) for cell in row) for row in rows]
    if heads and lines:
        lines.insert(0, tuple(Text(head, style="dim") for head in heads))
    widths = _column_widths(lines, console.width - 2 * INDENT)
    for line in lines:
        wrapped = [cell.wrap(console, width) for cell, width in zip(line, widths, strict=True)]
        for pieces in zip_longest(*wrapped, fillvalue=Text()):
            padded = [_padded(cell, w) for cell, w in zip(pieces, widths, strict=True)]
            _print_row(console, Text.assemble(" " * INDENT, *padded))


def _column_widths(lines: Sequence[Sequence[Text]], room: int) -> list[int]:
    """Return the widths of columns: the last gives way first, then the widest of the others."""
    widths = [max(cell.cell_len for cell in column) for column in zip(*lines, strict=True)]
    *others, last = widths or [0]
    gutters = _GUTTER * len(others)
    spare = room - gutters - min(last, _LEAST_ROOM)
    while sum(others) > spare and max(others) > _LEAST_ROOM:
        widest = others.index(max(others))
        others[widest] = max(_LEAST_ROOM, others[widest] - (sum(others) - spare))
    return [*others, max(min(last, room - gutters - sum(others)), min(last, _LEAST_ROOM), 1)]


def _padded(cell: Text, width: int) -> Text:
    return Text.assemble(cell, " " * (width - cell.cell_len + _GUTTER))


def _print_row(console: Console, row: Text) -> None:
    row.rstrip()
    console.print(row, no_wrap=True, overflow="ignore", crop=False)


def draw_cells(console: Console, *cells: Text) -> None:
    """Draw cells side by side; the last one wraps under itself."""
    *first, last = (_shown(console, cell) for cell in cells)
    start = Text.assemble(*first)
    room = max(console.width - 2 * INDENT - start.cell_len, _LEAST_ROOM)
    for row in last.wrap(console, room) or [Text()]:
        _print_row(console, Text.assemble(" " * INDENT, start, row))
        start = Text(" " * start.cell_len)


def draw_notes(console: Console, analysis: Analysis, result: StageResult | None = None) -> None:
    """Draw findings and warnings, each with its code."""
    findings = result.findings if result else ()
    warnings = (*analysis.warnings, *(result.warnings if result else ()))
    if not findings and not warnings:
        return
    console.print()
    for finding in findings:
        may_be = f" May be: {', '.join(finding.may_be)}." if finding.may_be else ""
        _draw_note(console, "seen", finding.code, finding.text + may_be)
    draw_notices(console, warnings)


def draw_notices(console: Console, notices: Iterable[Notice]) -> None:
    """Draw warnings, each once, with the code that ``explain`` knows."""
    for notice in dict.fromkeys(notices):
        _draw_note(console, "note", notice.code, notice.text)


def _draw_note(console: Console, kind: str, code: str, text: str) -> None:
    start = Text(f"{kind}  ", style="yellow")
    body = Text.assemble(printable(text), (f"  [{code}]", "dim"))
    draw_cells(console, start, body)


def draw_next(console: Console, command: str) -> None:
    """Draw the one command that a user may copy next; never wrapped, so that it can be copied."""
    console.print()
    line = Text.assemble(" " * INDENT, ("Next:  ", "dim"), printable(command))
    console.print(_shown(console, line), soft_wrap=True)
