"""``benchtool instruments list``: what is connected."""

from __future__ import annotations

import click

from benchtool.cli.exits import OK
from benchtool.cli.options import output_options
from benchtool.cli.output import Output


@click.command("list")
@click.option("--network", is_flag=True, help="Call out on the network too (takes seconds).")
@output_options
def command(network: bool, output: Output) -> int:
    """List what is connected here: serial ports and USB instruments.

    Nothing is opened and nothing is sent. The network is only called with --network.
    """
    from benchtool_drivers.discovery import look_around

    looked = look_around(network=network)
    rows = [
        {"resource": item.resource, "kind": item.kind, "about": item.about} for item in looked.found
    ]
    output.show_rows("instruments list", rows, "instruments:draw_found", rows, looked.notes)
    return OK
