"""``benchtool selftest``: formulas and uncertainties, tried on this machine."""

from __future__ import annotations

import click

from benchtool.cli.exits import INTERNAL, OK
from benchtool.cli.options import output_options
from benchtool.cli.output import Output


@click.command("selftest")
@click.option(
    "--captures",
    type=click.IntRange(100, 100_000),
    metavar="COUNT",
    default=1000,
    show_default=True,
    help="Simulated captures for the coverage.",
)
@output_options
def command(captures: int, output: Output) -> int:
    """Hold the closed forms against integration, and count how often U covers the truth.

    Exit code 70 where a line does not hold: then do not trust this installation.
    """
    from benchtool.selftest import run_selftest

    checks = run_selftest(n_captures=captures)
    rows = [
        {
            "name": item.name,
            "found": item.found,
            "limit": item.limit,
            "ok": item.ok,
            "text": item.text,
        }
        for item in checks
    ]
    output.show_rows("selftest", rows, "selfchecks:draw_selfchecks", rows)
    return OK if all(item.ok for item in checks) else INTERNAL
