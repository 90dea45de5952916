"""The manual: one entry, or the list of all."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import groupby

from rich.console import Console

from benchtool.manual import Entry
from benchtool.report.screen.blocks import draw_line, draw_next, draw_rows, draw_title


def draw_entry(console: Console, entries: Sequence[Entry]) -> None:
    """Draw an entry: text, formula, source."""
    for entry in entries:
        console.print()
        draw_title(console, entry.term, "bold", entry.title)
        for paragraph in entry.text.split("\n\n"):
            console.print()
            draw_line(console, paragraph)
        if entry.formula:
            console.print()
            for line in entry.formula.splitlines():
                draw_line(console, line, deeper=4)
        console.print()
        draw_line(console, f"Source: {entry.source}", "dim")
        following = entry.see_also[0] if entry.see_also else "guard band"
        if len(entry.see_also) > 1:
            draw_line(console, f"See also: {', '.join(entry.see_also)}", "dim")
        draw_next(console, f"benchtool explain {following}")


def draw_contents(console: Console, entries: Sequence[Entry]) -> None:
    """Draw all terms, topic by topic."""
    for topic, group in groupby(entries, key=lambda entry: entry.topic):
        console.print()
        draw_line(console, topic, "bold")
        draw_rows(console, [(entry.term, entry.title) for entry in group])
    draw_next(console, "benchtool explain guard band")
