"""What a live verb reads from, opened by its name.

A name with ``::`` is an instrument that is asked for records, a serial port or a URL one that sends
edges by itself, ``-`` and the name of a file something that grows. The drivers are loaded by name,
and only once something is opened.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any, Literal

from benchtool.errors import UsageError
from benchtool.frozen import frozen_record
from benchtool.instruments import Counter, Instrument, Order, Recorder, Stream
from benchtool.model.capture import Capture
from benchtool.model.counted import Counted
from benchtool.model.kit import KitInstrument
from benchtool.plugins import Registry

Kind = Literal["instrument", "stream", "file"]

DRIVERS = Registry(
    group="benchtool.drivers",
    ours={
        "instrument": "benchtool_drivers.opening:open_instrument",
        "stream": "benchtool_drivers.opening:open_stream",
        "file": "benchtool.jobs.following:open_growing",
    },
)
_PORT = re.compile(r"/dev/.+|COM\d+|[a-z][a-z0-9+.-]*://.*", re.IGNORECASE)


@frozen_record
class Wanted:
    """How a source is to be opened.

    Attributes:
        name: Name, as the user gave it.
        dialect: Name or file of an instrument's dialect; None leaves it to probing.
        description: Name or file of the description of a stream's lines; None for our own format.
        baud: Speed of a serial line; None for the usual one.
        log: File to which an instrument's exchange is logged.
        kept: What the user's kit says of it, where the name is one of the kit.
    """

    name: str
    dialect: str | None = None
    description: str | None = None
    baud: int | None = None
    log: Path | None = None
    kept: KitInstrument | None = None

    @property
    def resource(self) -> str:
        """The connection: the kit's, where the name is one of the kit."""
        return self.kept.resource or self.name if self.kept else self.name


def kind_of(resource: str) -> Kind:
    """Return what a source is, by its name alone.

    Raises:
        UsageError: If it is neither a resource, a port nor a file (``no-such-source``).
    """
    if "::" in resource:
        return "instrument"
    if _PORT.fullmatch(resource):
        return "stream"
    if resource and (resource == "-" or Path(resource).exists()):
        return "file"
    raise UsageError(
        f"there is nothing live called {resource!r}",
        hint="Give a resource such as TCPIP::192.0.2.7::hislip0::INSTR, a serial port, a file that "
        "grows, or a name of your kit; benchtool instruments list shows what is connected.",
        code="no-such-source",
    )


def open_instrument(wanted: Wanted) -> Instrument:
    """Open an instrument.

    Raises:
        InstrumentError: As the tree in ``benchtool.errors`` says.
        UsageError: If no dialect fits, or several do.
    """
    given = wanted.dialect or (wanted.kept.dialect if wanted.kept else None)
    opener: Callable[..., Instrument] = _opener("instrument")
    return opener(wanted.resource, dialect=given, log=wanted.log)


def open_stream(wanted: Wanted) -> Stream:
    """Open anything that delivers by itself; an instrument is asked again and again.

    Raises:
        InstrumentError: As the tree in ``benchtool.errors`` says.
        InputError: If a file cannot be opened.
    """
    kind = kind_of(wanted.resource)
    if kind == "instrument":
        return Repeated(open_instrument(wanted), channels_of(wanted.kept, ()))
    if kind == "file":
        opener: Callable[..., Stream] = _opener("file")
        return opener(wanted.resource)
    return open_recorder(wanted)


def open_recorder(wanted: Wanted) -> Recorder:
    """Open a serial port or URL that sends edges by itself.

    Raises:
        InstrumentError: As the tree in ``benchtool.errors`` says.
    """
    opener: Callable[..., Recorder] = _opener("stream")
    return opener(wanted.resource, description=wanted.description, baud=wanted.baud)


FEW_READINGS = 10
"""Readings of a counter that make one update of a watch."""


class Repeated:
    """An instrument that is asked for record after record, as a stream.

    Args:
        instrument: The instrument; closed with the stream.
        channels: The channels to ask for.
    """

    def __init__(self, instrument: Instrument, channels: tuple[str, ...]) -> None:
        self.instrument = instrument
        self._channels = channels

    @property
    def source(self) -> str:
        """The connection, as the user named it."""
        return self.instrument.resource

    def newest(self, timeout_s: float) -> Capture | Counted:
        """Return the next record, or a counter's next readings; the time is for the trigger."""
        order = Order(channels=self._channels, trigger_timeout_s=max(timeout_s, 1.0))
        if isinstance(self.instrument, Counter):
            few = replace(order, readings=FEW_READINGS, trigger_timeout_s=None)
            if self.instrument.delivers == "readings":
                return self.instrument.count(few)
            return self.instrument.acquire(few)
        return self.instrument.acquire(order)

    def close(self) -> None:
        """End the connection."""
        self.instrument.close()


def channels_of(kept: KitInstrument | None, asked: tuple[str, ...]) -> tuple[str, ...]:
    """Return the instrument's names of channels: those asked for, through the kit's map."""
    known = kept.channels if kept else {}
    return tuple(known.get(name, name) for name in asked) or tuple(known.values())


def _opener(kind: Kind) -> Any:
    return DRIVERS.load(kind)
