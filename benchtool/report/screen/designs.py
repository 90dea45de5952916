"""A design, value by value."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import groupby

from rich.console import Console

from benchtool.model.design import Design, DesignValue
from benchtool.report.commands import quoted
from benchtool.report.screen.blocks import draw_heading, draw_line, draw_next, draw_rows


def draw_design(console: Console, design: Design, rows: Sequence[DesignValue]) -> None:
    """Draw every value under the table of the file it belongs to."""
    draw_heading(console, design.name, design.source)
    for section, group in groupby(rows, key=lambda row: row.section):
        console.print()
        draw_line(console, section, "bold")
        draw_rows(console, [(row.key, row.value, row.origin) for row in group])
    draw_next(console, f"benchtool design check {quoted(design.source)}")
