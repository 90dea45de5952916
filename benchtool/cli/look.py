"""``benchtool look``: what a capture holds."""

from __future__ import annotations

import click

from benchtool.cli.exits import OK
from benchtool.cli.options import measuring_options, output_options, report_option
from benchtool.cli.output import Output
from benchtool.model.options import MeasureOptions


@click.command("look")
@click.argument("files", nargs=-1, required=True, metavar="FILE...")
@report_option
@measuring_options
@output_options
def command(
    files: tuple[str, ...], report: str | None, options: MeasureOptions, output: Output
) -> int:
    """Show what each FILE holds: how it was read and from what evidence, and its traces."""
    from benchtool.pipeline import look

    output.show(look(files, options=options), report=report)
    return OK
