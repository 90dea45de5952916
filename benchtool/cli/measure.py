"""``benchtool measure``: the timing of a capture."""

from __future__ import annotations

from pathlib import Path

import click

from benchtool.cli.exits import OK
from benchtool.cli.options import measuring_options, output_options, report_option
from benchtool.cli.output import Output, write_file
from benchtool.errors import UsageError
from benchtool.model.options import MeasureOptions


@click.command("measure")
@click.argument("file", metavar="FILE")
@click.option("--budget", is_flag=True, help="Show what each uncertainty is made of.")
@click.option("--intervals", metavar="OUT.csv", help="Write every interval to a file.")
@click.option("--baseline", metavar="FILE", help="An earlier capture of the same board.")
@report_option
@measuring_options
@output_options
def command(
    file: str,
    budget: bool,
    intervals: str | None,
    baseline: str | None,
    report: str | None,
    options: MeasureOptions,
    output: Output,
) -> int:
    """Measure high and low time, period, frequency, duty and jitter of FILE, each with its U.

    FILE is a capture, or - for standard input.
    """
    from benchtool.pipeline import measure

    analysis = measure(file, baseline=baseline, options=options)
    if intervals is not None and analysis.results[0].series is None:
        raise UsageError(
            f"{file} holds a counter's readings, and no intervals with their times",
            hint="Leave out --intervals; the readings themselves stand in the file.",
            code="counter-readings",
        )
    if intervals is not None and analysis.results[0].series is not None:
        from benchtool.report.intervals import intervals_csv

        table = intervals_csv(analysis.results[0].series)
        write_file(Path(intervals), table.encode(), force=output.force)
    output.show(analysis, report=report, budget=budget)
    return OK
