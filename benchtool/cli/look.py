"""``benchtool look``: what a capture holds."""

from __future__ import annotations

import click

from benchtool.cli.exits import OK
from benchtool.cli.options import measuring_options, output_options, report_option
from benchtool.cli.output import Output
from benchtool.errors import UsageError
from benchtool.model.options import MeasureOptions


@click.command("look")
@click.argument("files", nargs=-1, required=True, metavar="FILE...")
@click.option("--keep", metavar="NAME", help="Keep the options given for all files like FILE.")
@click.option("--everywhere", is_flag=True, help="Keep them for all folders, not beside FILE.")
@report_option
@measuring_options
@output_options
def command(
    files: tuple[str, ...],
    keep: str | None,
    everywhere: bool,
    report: str | None,
    options: MeasureOptions,
    output: Output,
) -> int:
    """Show what each FILE holds: how it was read and from what evidence, and its traces.

    \b
    benchtool look capture.csv --time-unit ms --keep mist-logger
    """  # noqa: D301 - click's mark of lines to keep as they are
    from benchtool.pipeline import look

    if keep is None:
        if everywhere:
            raise UsageError("--everywhere keeps nothing by itself", hint="Give --keep NAME too.")
        output.show(look(files, options=options), report=report)
        return OK
    if len(files) > 1:
        raise UsageError("--keep is settled by one file", hint="Look at one of them.")
    from benchtool.cli.keeping import keep_structure, write_structure

    analysis = look(files, options=options)  # what cannot be read is not kept
    kept = keep_structure(files[0], keep, options.read, everywhere=everywhere, force=output.force)
    output.show(analysis, report=report)
    write_structure(kept, output)
    return OK
