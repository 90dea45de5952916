"""Uncertainty budgets, a table a quantity."""

from __future__ import annotations

import math

from rich.console import Console

from benchtool.model.quantity import Measured
from benchtool.model.result import StageResult
from benchtool.report.phrases import gloss, quantity_text
from benchtool.report.screen.blocks import draw_rows, draw_title
from benchtool.uncertainty import coverage_factor
from benchtool.units import format_value

_NAMES = ("t_high", "t_low", "period", "frequency", "duty", "first_high", "delay")
_MANY_DOF = 1000  # from here k is 1.96
_HEADS = ("contribution", "u", "share", "dof", "from")


def draw_budgets(console: Console, result: StageResult) -> None:
    """Draw what the uncertainty of every timing quantity is made of."""
    for name in _NAMES:
        figure = getattr(result.timing, name, None)
        if isinstance(figure, Measured):
            _draw_budget(console, name, figure)


def _draw_budget(console: Console, name: str, figure: Measured) -> None:
    console.print()
    words = (gloss(name), quantity_text(figure))
    draw_title(console, name, "bold", "   ".join(word for word in words if word))
    variance = sum(part.u**2 for part in figure.budget) or 1.0
    rows = [
        (
            part.source,
            format_value(abs(part.u), figure.unit, 2),
            f"{100 * part.u**2 / variance:.0f} %",
            _dof_text(part.dof),
            part.note,
        )
        for part in sorted(figure.budget, key=lambda part: -abs(part.u))
    ]
    k = coverage_factor(figure.dof)
    total = f"U = {k:.2f}·u at 95 %"
    rows.append(("all", format_value(figure.u, figure.unit, 2), "", _dof_text(figure.dof), total))
    draw_rows(console, rows, heads=_HEADS)


def _dof_text(dof: float) -> str:
    return f"{math.floor(dof)}" if dof < _MANY_DOF else "∞"


def draw_changes(console: Console, result: StageResult) -> None:
    """Draw the change of every quantity against the baseline."""
    rows = [
        (
            item.quantity,
            quantity_text(item.before),
            quantity_text(item.change),
            "changed" if item.significant else "no change seen",
        )
        for item in result.changes
    ]
    if rows:
        console.print()
        draw_rows(console, rows, heads=("against the baseline", "was", "change", ""))
