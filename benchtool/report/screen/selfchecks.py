"""The lines of a self-test."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from rich.console import Console

from benchtool.report.screen.blocks import draw_line, draw_next, draw_rows

_MARK = {True: "holds", False: "FAILS"}


def draw_selfchecks(console: Console, rows: Sequence[Mapping[str, Any]]) -> None:
    """Draw a line a check, and whether all of them hold."""
    console.print()
    draw_rows(console, [(_MARK[row["ok"]], row["name"], row["text"]) for row in rows])
    console.print()
    failed = sum(not row["ok"] for row in rows)
    if failed:
        draw_line(console, f"{failed} of {len(rows)} do not hold.", "bold red")
    else:
        draw_line(console, f"All {len(rows)} hold.", "bold green")
    draw_next(console, "benchtool explain U")
