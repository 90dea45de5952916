"""Opening what is live: an instrument that is asked, or a stream that comes by itself."""

from __future__ import annotations

import time
from collections.abc import Callable, Mapping
from contextlib import ExitStack
from importlib import import_module
from pathlib import Path
from typing import cast

from benchtool.instruments import Instrument, Recorder
from benchtool_drivers.dialect import Dialect, find_dialect
from benchtool_drivers.dialect.choosing import Choice, Look, choose_dialect
from benchtool_drivers.dialect.linking import link_settings
from benchtool_drivers.digitiser.talk import Tell
from benchtool_drivers.link import ExchangeLog, Link, LinkSettings

DRIVERS: Mapping[str, str] = {
    "digitiser": "benchtool_drivers.digitiser.digitiser:Digitiser",
    "counter": "benchtool_drivers.counter.counter:Counter",
}
"""Each kind of dialect, and the class that speaks it."""


def open_instrument(
    resource: str,
    *,
    dialect: str | Dialect | None = None,
    log: ExchangeLog | Path | None = None,
    settings: LinkSettings | None = None,
    look: Look | None = None,
    tell: Tell | None = None,
) -> Instrument:
    """Connect to an instrument that delivers records.

    Args:
        resource: A VISA resource string.
        dialect: Name or file of its dialect; None to take the one it was spoken to in before, or
            to find it by harmless queries.
        log: Where to write what is said; a file keeps whole answers, so that it can be played
            back, and is closed with the instrument.
        settings: How it talks until its dialect is known, or instead of what its dialect says.
        look: Is told how each dialect did, where it is probed.
        tell: Is told each step of what is said.

    Returns:
        The instrument; its dialect is set up with the first record.

    Raises:
        UsageError: If there is no such dialect (``no-such-dialect``), or several fit
            (``several-dialects``).
        DesignError: If the dialect has faults (``dialect``).
        InstrumentError: If it cannot be reached, does not answer, or no dialect fits
            (``no-dialect``).
    """
    named = find_dialect(dialect) if isinstance(dialect, str) else dialect
    first = settings or (link_settings(named.link) if named else LinkSettings())
    with ExitStack() as opened:
        own = ExchangeLog(log, whole=True) if isinstance(log, Path) else None
        if own is not None:
            opened.callback(own.close)
        link = Link.open(resource, first, log=own if isinstance(log, Path) else log)
        opened.callback(link.close)
        choice = Choice(dialect=named, how="as you said") if named else _chosen(link, look)
        link.use(settings or link_settings(choice.dialect.link))
        driver = _driver(choice.dialect.kind)
        instrument = driver(link, choice.dialect, chosen=choice.how, tell=tell, log=own)
        opened.pop_all()
    return instrument


def open_stream(
    name: str, *, description: str | Path | None = None, baud: int | None = None
) -> Recorder:
    """Open a serial port or a URL that sends edges by itself.

    Args:
        name: A serial port, or a URL of pyserial.
        description: Name or file of the description of its lines; None for our own format.
        baud: Speed of a serial line; None for the usual one.

    Raises:
        InstrumentError: As the tree in ``benchtool.errors`` says.
    """
    from benchtool_drivers.streams.opening import open_stream as open_edges

    return open_edges(name, description=description, baud=baud)


def _chosen(link: Link, look: Look | None) -> Choice:
    return choose_dialect(link, quick_s=answer_time_s(link), look=look)


def answer_time_s(link: Link) -> float:
    """Return how long the instrument takes to say who it is."""
    began_s = time.monotonic()
    link.ask("*IDN?")
    return time.monotonic() - began_s


def _driver(kind: str) -> Callable[..., Instrument]:
    module, _, name = DRIVERS[kind].partition(":")
    return cast("Callable[..., Instrument]", getattr(import_module(module), name))
