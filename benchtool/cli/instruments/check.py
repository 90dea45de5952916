"""``benchtool instruments check``: every fault of a dialect file with its line."""

from __future__ import annotations

import click

from benchtool.cli.exits import OK
from benchtool.cli.options import output_options
from benchtool.cli.output import Output


@click.command("check")
@click.argument("file", metavar="FILE")
@output_options
def command(file: str, output: Output) -> int:
    """Check a dialect file: every fault with its line, or what the dialect does.

    Nothing is connected. Exit code: 0 sound, 6 where it has faults.
    """
    from pathlib import Path

    from benchtool_drivers.dialect import load_dialect
    from benchtool_drivers.dialect.reference import describe

    dialect = load_dialect(Path(file))
    said = [{"about": about, "text": text} for about, text in describe(dialect)]
    row = {"file": file, "name": dialect.name, "kind": dialect.kind, "does": said}
    output.show_rows("instruments check", [row], "instruments:draw_checked", row)
    return OK
