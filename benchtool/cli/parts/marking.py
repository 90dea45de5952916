"""``benchtool parts marking``: what parts are marked with."""

from __future__ import annotations

from typing import Any

import click

from benchtool.cli.exits import OK
from benchtool.cli.options import output_options
from benchtool.cli.output import Output


@click.command("marking")
@click.argument("texts", nargs=-1, required=True, metavar="TEXT...")
@click.option("--kind", type=click.Choice(["capacitor", "resistor"]), help="What the part is.")
@output_options
def command(texts: tuple[str, ...], kind: Any, output: Output) -> int:
    """Decode part markings: 103, 4n7K, 472 X7R 50V, yellow violet red gold.

    Every sound way to read a marking is shown, the likeliest first.
    """
    from benchtool.parts import decode, split_markings

    decoded = [(text, decode(text, kind=kind)) for text in split_markings(texts)]
    rows = [_row(reading) for _, readings in decoded for reading in readings]
    output.show_rows("parts marking", rows, "markings:draw_markings", decoded)
    return OK


def _row(item: Any) -> dict[str, Any]:
    tolerance = item.tolerance_rel
    return {
        "text": item.text,
        "kind": item.kind,
        "value": item.value,
        "unit": item.unit,
        "how": item.how,
        "lower_rel": tolerance[0] if tolerance else None,
        "upper_rel": tolerance[1] if tolerance else None,
        "temperature_code": item.temperature_code,
        "tempco_per_k": item.tempco_per_k,
        "rated_voltage_v": item.rated_voltage_v,
        "preferred": item.preferred,
        "notes": list(item.notes),
    }
