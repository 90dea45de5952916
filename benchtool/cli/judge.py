"""``benchtool judge``: a capture against its design."""

from __future__ import annotations

import click

from benchtool.cli.exits import BY_VERDICT
from benchtool.cli.options import measuring_options, output_options, report_option
from benchtool.cli.output import Output
from benchtool.model.options import MeasureOptions


@click.command("judge")
@click.argument("file", metavar="FILE")
@click.option("--design", required=True, metavar="FILE", help="The design file (TOML).")
@click.option("--stage", metavar="NAME", help="Judge this stage alone.")
@report_option
@measuring_options
@output_options
def command(
    file: str,
    design: str,
    stage: str | None,
    report: str | None,
    options: MeasureOptions,
    output: Output,
) -> int:
    """Hold the timing of FILE against the design: a verdict for each limit, with its reason.

    Exit code: 0 pass, 1 fail, 3 undecided or conditional, 4 unusable.
    """
    from benchtool.pipeline import analyse

    analysis = analyse(file, design, stage=stage, options=options)
    output.show(analysis, report=report)
    return BY_VERDICT[analysis.verdict]
