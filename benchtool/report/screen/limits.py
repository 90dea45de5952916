"""Limits three ways."""

from __future__ import annotations

from collections.abc import Sequence

from rich.console import Console

from benchtool.model.decision import LimitComparison
from benchtool.model.design import Design, Stage
from benchtool.report.commands import quoted
from benchtool.report.phrases import gloss, limits_text
from benchtool.report.screen.blocks import (
    draw_heading,
    draw_line,
    draw_next,
    draw_notices,
    draw_rows,
    draw_title,
)
from benchtool.units import format_value

_MARK = {True: "->", False: ""}


def draw_limits(
    console: Console,
    design: Design,
    compared: Sequence[tuple[Stage, Sequence[LimitComparison]]],
) -> None:
    """Draw a block a quantity: a row for each way, an arrow at the one in use."""
    draw_heading(console, design.name, design.source)
    for stage, limits in compared:
        console.print()
        draw_line(console, f"stage {stage.name}, {stage.topology}", "bold")
        for limit in limits:
            _draw_quantity(console, limit)
        draw_notices(console, [item for limit in limits for item in limit.warnings])
    draw_next(console, f"benchtool design check {quoted(design.source)}")


def _draw_quantity(console: Console, limit: LimitComparison) -> None:
    console.print()
    words = [gloss(limit.quantity)]
    if limit.nominal is not None:
        words.append(f"nominal {format_value(limit.nominal, limit.unit, 5)}")
    draw_title(console, limit.quantity, "bold", "   ".join(word for word in words if word))
    rows: list[tuple[str, str, str, str]] = [
        (
            _MARK[limit.used == item.method],
            item.method,
            limits_text(item.lower, item.upper, item.unit),
            "",
        )
        for item in limit.derived
    ]
    if limit.given is not None:
        given = limit.given
        text = limits_text(given.lower, given.upper, given.unit)
        rows.append((_MARK[limit.used == "given"], "stated", text, given.source))
    draw_rows(console, rows)
    if limit.used is None:
        draw_line(console, "not judged", "dim")
    if limit.room is not None:
        draw_line(console, f"half the distance between the limits is {limit.room:.1f} U", "dim")
