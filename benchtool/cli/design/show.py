"""``benchtool design show``: every value, stated or not."""

from __future__ import annotations

import click

from benchtool.cli.exits import OK
from benchtool.cli.options import output_options
from benchtool.cli.output import Output


@click.command("show")
@click.argument("file", metavar="FILE")
@output_options
def command(file: str, output: Output) -> int:
    """Show every value that the design works with, and where it comes from."""
    from benchtool.designs import load_design, show_rows

    design = load_design(file)
    shown = show_rows(design)
    rows = [
        {"section": row.section, "key": row.key, "value": row.value, "origin": row.origin}
        for row in shown
    ]
    output.show_rows("design show", rows, "designs:draw_design", design, shown)
    return OK
