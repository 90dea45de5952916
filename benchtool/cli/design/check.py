"""``benchtool design check``: faults with their lines, and what physics says."""

from __future__ import annotations

import click

from benchtool.cli.exits import DESIGN, OK
from benchtool.cli.options import output_options
from benchtool.cli.output import Output


@click.command("check")
@click.argument("file", metavar="FILE")
@output_options
def command(file: str, output: Output) -> int:
    """Check a design file: every fault of form with its line, then what cannot work.

    Exit code: 0 sound (warnings allowed), 6 where a good board could not pass.
    """
    from benchtool.designs import load_design
    from benchtool.judge import examine

    design = load_design(file)
    concerns = examine(design)
    rows = [
        {"severity": item.severity, "key": item.key, "text": item.text, "hint": item.hint}
        for item in concerns
    ]
    output.show_rows("design check", rows, "concerns:draw_concerns", design, concerns)
    return DESIGN if any(item.severity == "error" for item in concerns) else OK
