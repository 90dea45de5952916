"""What a check of a design found."""

from __future__ import annotations

from collections.abc import Sequence

from rich.console import Console

from benchtool.model.decision import Concern
from benchtool.model.design import Design
from benchtool.report.commands import quoted
from benchtool.report.screen.blocks import draw_heading, draw_line, draw_next, draw_title

_STYLES = {"error": "bold red", "warning": "bold yellow"}


def draw_concerns(console: Console, design: Design, concerns: Sequence[Concern]) -> None:
    """Draw each concern with its key and what to do, errors first."""
    draw_heading(console, design.name, design.source)
    console.print()
    if not concerns:
        draw_line(console, "Sound: no fault of form, and nothing that cannot work.", "bold green")
    for concern in sorted(concerns, key=lambda item: item.severity):
        draw_title(console, concern.severity, _STYLES[concern.severity], concern.key)
        draw_line(console, concern.text)
        draw_line(console, concern.hint, "dim")
        console.print()
    draw_next(console, f"benchtool design limits {quoted(design.source)}")
