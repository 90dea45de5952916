"""``benchtool instruments identify``: who answers, and which dialect fits."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import click

from benchtool.cli.exits import INSTRUMENT, OK, USAGE
from benchtool.cli.instruments.resource import exchange_log, log_option, resource_of
from benchtool.cli.options import output_options
from benchtool.cli.output import Output

if TYPE_CHECKING:
    from benchtool_drivers.dialect.probing import Fit


@click.command("identify")
@click.argument("resource", metavar="RESOURCE")
@log_option
@output_options
def command(resource: str, log: str | None, output: Output) -> int:
    """Ask an instrument who it is, and find out which dialect it speaks.

    Only queries that change nothing are sent; the error queue is read after each. The dialect that
    fits is remembered for this instrument.

    Exit code: 0 one dialect fits, 2 several do, 5 none does or nothing answers.
    """
    from benchtool.cli.cautions import tell_cautions
    from benchtool_drivers.dialect import known_dialects
    from benchtool_drivers.dialect.probing import Prober
    from benchtool_drivers.dialect.remembering import remember
    from benchtool_drivers.link import Link
    from benchtool_drivers.opening import answer_time_s

    name = resource_of(resource)
    tell_cautions(output)
    with exchange_log(log) as said:
        link = Link.open(name, log=said)
        try:
            known = known_dialects()
            fits = Prober(link, answer_time_s(link)).probe(known.dialects.values())
            identity = link.identity
        finally:
            link.close()
    found = [fit.dialect.name for fit in fits if fit.fits]
    if len(found) == 1:
        remember(identity, found[0])
    row = {
        "resource": name,
        "identity": identity,
        "dialect": found[0] if len(found) == 1 else None,
        "fitting": found,
        "dialects": [_row(fit) for fit in fits],
        "faulty_files": [error.message for error in known.faulty],
    }
    output.show_rows("instruments identify", [row], "instruments:draw_identity", row)
    return OK if len(found) == 1 else USAGE if found else INSTRUMENT


def _row(fit: Fit) -> dict[str, Any]:
    return {
        "name": fit.dialect.name,
        "kind": fit.dialect.kind,
        "fits": fit.fits,
        "why": fit.why,
        "asked": [
            {"query": item.query, "answer": item.answer, "why_not": item.why_not or None}
            for item in fit.asked
        ],
    }
