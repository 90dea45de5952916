"""What the verbs draw on a terminal: calm, aligned, readable at 80 columns, colour optional."""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from rich.console import Console

    from benchtool.model.result import Analysis

_SCREENS = {
    "look": "looked:draw_looked",
    "measure": "measured:draw_measured",
    "solve": "solved:draw_solved",
    "judge": "judged:draw_judged",
    "diagnose": "diagnosed:draw_diagnosed",
}


def draw_analysis(console: Console, analysis: Analysis, *, budget: bool = False) -> None:
    """Draw the screen of the verb that made the analysis.

    Args:
        console: Where to draw.
        analysis: What was found.
        budget: Whether to draw the budget of every timing quantity too, where it measures.
    """
    module, _, function = _SCREENS[analysis.command].partition(":")
    more = {"budget": True} if budget else {}
    getattr(import_module(f"{__name__}.{module}"), function)(console, analysis, **more)
