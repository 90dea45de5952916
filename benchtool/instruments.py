"""What a driver must offer: the seam between live instruments and everything else.

An instrument that is asked for a record is an ``Instrument``; one that sends edges by itself, and a
file that grows, is a ``Stream``. Either gives whole captures or raises; never a part of one.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Literal, Protocol, runtime_checkable

from benchtool.frozen import frozen_record
from benchtool.model.capture import Capture
from benchtool.model.counted import Counted

Progress = Callable[[int, int], None]
"""Is told bytes behind, and bytes in all (0 where nobody knows)."""

Armed = Callable[[], None]
"""Is told once the instrument waits for its trigger."""


@frozen_record
class Order:
    """What to acquire.

    Attributes:
        channels: Names of the channels as the instrument knows them; none for the dialect's own.
        arm: Start a new acquisition; otherwise what is in the instrument's memory is read.
        force: Trigger it by command where it waits; only when the user asked for that.
        trigger_timeout_s: How long to wait for the trigger; None for the dialect's own time.
        settings: Commands to send first, each as the user gave it; an order without them leaves
            the instrument as it stands.
        functions: What a counter is to count; none for all that its dialect knows.
        readings: Readings of each function, or time stamps; None for the dialect's own number.
    """

    channels: tuple[str, ...] = ()
    arm: bool = True
    force: bool = False
    trigger_timeout_s: float | None = None
    settings: tuple[str, ...] = ()
    functions: tuple[str, ...] = ()
    readings: int | None = None


class Instrument(Protocol):
    """An instrument that delivers a record when asked."""

    @property
    def resource(self) -> str:
        """The connection, as the user named it."""
        ...

    @property
    def identity(self) -> str:
        """What it answers when asked who it is; shown and stored, never interpreted."""
        ...

    @property
    def dialect(self) -> str:
        """Name of the dialect it is spoken to in."""
        ...

    def settings(self) -> tuple[tuple[str, str], ...]:
        """Return the settings that its dialect knows how to read, each query with its answer."""
        ...

    def acquire(
        self, order: Order, *, progress: Progress | None = None, armed: Armed | None = None
    ) -> Capture:
        """Return one whole record.

        Raises:
            InstrumentError: As the tree in ``benchtool.errors`` says; nothing is returned then.
        """
        ...

    def close(self) -> None:
        """End the connection, leaving the instrument as it was found."""
        ...


@runtime_checkable
class Counter(Instrument, Protocol):
    """An instrument that counts: it delivers single readings, or time stamps of edges."""

    @property
    def delivers(self) -> Literal["readings", "edges"]:
        """Whether ``count`` or ``acquire`` gives what it has; the other one is refused."""
        ...

    def count(
        self, order: Order, *, progress: Progress | None = None, armed: Armed | None = None
    ) -> Counted:
        """Return the readings of each function; ``progress`` is told readings behind and in all.

        Raises:
            InstrumentError: As the tree in ``benchtool.errors`` says; nothing is returned then.
        """
        ...


class Stream(Protocol):
    """Something that delivers edges or samples by itself: a serial line, a file that grows."""

    @property
    def source(self) -> str:
        """The connection or file, as the user named it."""
        ...

    def newest(self, timeout_s: float) -> Capture | Counted | None:
        """Return what came last, None where nothing new came within the time.

        A capture holds the newest stretch of the stream (a window that its opener chose), as
        one trace or several; what was lost on the way is a gap, and counted in its warnings.
        A counter that is asked again and again gives its readings in place of captures.

        Raises:
            InstrumentError: If the stream has ended or the connection has gone.
        """
        ...

    def close(self) -> None:
        """End the connection."""
        ...


class Recorder(Stream, Protocol):
    """A stream that can also be recorded from now on."""

    def record(
        self,
        *,
        until_periods: int | None = None,
        duration_s: float | None = None,
        progress: Progress | None = None,
    ) -> Capture:
        """Return all of the stream from now until so many periods or seconds have come.

        Raises:
            InstrumentError: If the stream ends or goes before; nothing is returned then.
        """
        ...
