"""``benchtool design limits``: limits three ways."""

from __future__ import annotations

import math
from typing import Any

import click

from benchtool.cli.exits import OK
from benchtool.cli.options import output_options, share
from benchtool.cli.output import Output


@click.command("limits")
@click.argument("file", metavar="FILE")
@click.option("--stage", metavar="NAME", help="Show this stage alone.")
@click.option("--expect", metavar="REL", help="Relative U to expect, such as 0.1%: shows the room.")
@output_options
def command(file: str, stage: str | None, expect: str | None, output: Output) -> int:
    """Show each quantity's limits by worst case, rss and Monte Carlo, and which one is used."""
    from benchtool.designs import load_design
    from benchtool.judge import limits_three_ways
    from benchtool.targets import choose_stages
    from benchtool.uncertainty import coverage_factor

    design = load_design(file)
    U_rel = share("--expect", expect)
    k = coverage_factor(math.inf, design.rule.coverage)
    u_rel = None if U_rel is None else U_rel / k
    compared = [
        (item, limits_three_ways(item, design, expected_u_rel=u_rel))
        for item in choose_stages(design, stage)
    ]
    rows = [_row(item.name, limit) for item, limits in compared for limit in limits]
    output.show_rows("design limits", rows, "limits:draw_limits", design, compared)
    return OK


def _row(stage: str, limit: Any) -> dict[str, Any]:
    return {
        "stage": stage,
        "quantity": limit.quantity,
        "unit": limit.unit,
        "nominal": limit.nominal,
        "derived": {
            item.method: {"lower": item.lower, "upper": item.upper} for item in limit.derived
        },
        "used": limit.used,
        "lower": limit.lower,
        "upper": limit.upper,
        "source": limit.given.source if limit.given else None,
        "U": limit.U,
        "room": limit.room,
        "warnings": [{"code": item.code, "text": item.text} for item in limit.warnings],
    }
