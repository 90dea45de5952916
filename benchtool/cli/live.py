"""Options of the verbs that read from a live source."""

from __future__ import annotations

from collections.abc import Callable
from functools import wraps
from pathlib import Path
from typing import Any

import click

from benchtool.errors import UsageError

_LIVE = (
    click.option("--dialect", metavar="NAME", help="Dialect of the instrument, by name or file."),
    click.option("--lines", metavar="FILE", help="Description of a logger's lines."),
    click.option("--baud", type=click.IntRange(min=1), metavar="N", help="Speed of a serial line."),
    click.option("--log", metavar="FILE", help="Log the exchange with the instrument."),
)


def live_options(function: Callable[..., Any]) -> Callable[..., Any]:
    """Add the options of a live source; the function gets a ``wanted`` record for its SOURCE."""

    @wraps(function)
    def gather(*, source: str, **given: Any) -> Any:
        from benchtool.jobs.sources import Wanted

        log = given.pop("log")
        wanted = Wanted(
            name=source,
            dialect=given.pop("dialect"),
            description=given.pop("lines"),
            baud=given.pop("baud"),
            log=log and Path(log),
            kept=_kept(source),
        )
        return function(wanted=wanted, **given)

    for option in reversed(_LIVE):
        gather = option(gather)
    return gather


def _kept(source: str) -> Any:
    """Return what the user's kit says of a source, where it is a name of the kit."""
    if "::" in source or "/" in source or source == "-":
        return None
    from benchtool.cli.kit import instrument_in_kit, user_kit

    kit = user_kit()
    if not kit or source not in kit.instruments:
        return None
    kept = instrument_in_kit(source)
    if kept.resource is None:
        raise UsageError(
            f"your kit gives no resource for {source!r}",
            hint=f'Add resource = "TCPIP::192.0.2.7::hislip0::INSTR" or a serial port to '
            f"[instrument.{source}]; `benchtool instruments list` shows what is connected.",
            code="no-such-source",
        )
    return kept
