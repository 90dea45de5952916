"""``benchtool explain``: the manual."""

from __future__ import annotations

from typing import TYPE_CHECKING

import click

from benchtool.cli.exits import OK
from benchtool.cli.options import output_options
from benchtool.cli.output import Output
from benchtool.errors import UsageError

if TYPE_CHECKING:
    from benchtool.manual import Entry


@click.command("explain")
@click.argument("term", nargs=-1, metavar="[TERM]")
@output_options
def command(term: tuple[str, ...], output: Output) -> int:
    """Explain a word, figure, warning, error code, fault or formula; without TERM list them."""
    from benchtool.manual import entries

    found = [_find(" ".join(term))] if term else list(entries())
    rows = [
        {
            "term": entry.term,
            "title": entry.title,
            "text": entry.text,
            "formula": entry.formula,
            "source": entry.source,
            "see_also": list(entry.see_also),
        }
        for entry in found
    ]
    screen = "manual:draw_entry" if term else "manual:draw_contents"
    output.show_rows("explain", rows, screen, found)
    return OK


def _find(term: str) -> Entry:
    from benchtool.manual import lookup, nearest

    entry = lookup(term)
    if entry is not None:
        return entry
    near = nearest(term)
    hint = f"Did you mean: {', '.join(near)}?" if near else "List them all: benchtool explain"
    raise UsageError(f"the manual has no entry {term!r}", hint=hint, code="no-such-term")
