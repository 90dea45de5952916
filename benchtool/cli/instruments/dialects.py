"""``benchtool instruments dialects``: which there are, one of them, or all their keys."""

from __future__ import annotations

import click

from benchtool.cli.exits import OK
from benchtool.cli.options import output_options
from benchtool.cli.output import Output
from benchtool.errors import UsageError


@click.command("dialects")
@click.argument("name", metavar="[NAME]", required=False)
@click.option("--keys", is_flag=True, help="Every key of a dialect file, with its meaning.")
@output_options
def command(name: str | None, keys: bool, output: Output) -> int:
    """List the dialects, or print the file of one, to begin your own with.

    \b
    benchtool instruments dialects
    benchtool instruments dialects list-of-volts -o mine.toml
    """  # noqa: D301 - click's mark of lines to keep as they are
    if keys and name:
        raise UsageError("--keys and NAME are two questions", hint="Give one of the two.")
    if keys:
        return _show_keys(output)
    from benchtool_drivers.dialect import find_dialect, known_dialects

    if name:
        output.print_text("instruments dialects", find_dialect(name).text)
        if output.path not in (None, "-"):
            output.tell_written([str(output.path)], "benchtool instruments check")
        return OK
    known = known_dialects()
    rows = [
        {"name": item.name, "kind": item.kind, "basis": item.basis, "file": item.source}
        for item in known.dialects.values()
    ]
    faulty = [error.message for error in known.faulty]
    output.show_rows("instruments dialects", rows, "instruments:draw_dialects", rows, faulty)
    return OK


def _show_keys(output: Output) -> int:
    from benchtool_drivers.dialect.reference import key_rows

    rows = [
        {
            "table": row.table,
            "key": row.key,
            "meaning": row.meaning,
            "default": row.default,
            "example": row.example,
        }
        for row in key_rows()
    ]
    output.show_rows("instruments dialects", rows, "instruments:draw_keys", rows)
    return OK
