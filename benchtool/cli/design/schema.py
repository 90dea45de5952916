"""``benchtool design schema``: the JSON Schema of design files."""

from __future__ import annotations

import json

import click

from benchtool.cli.exits import OK
from benchtool.cli.options import output_options
from benchtool.cli.output import Output


@click.command("schema")
@output_options
def command(output: Output) -> int:
    """Print the JSON Schema of design files, for editors that check as you type."""
    from benchtool.designs import design_schema

    output.print_text(
        "design schema", json.dumps(design_schema(), indent=2, ensure_ascii=False) + "\n"
    )
    return OK
