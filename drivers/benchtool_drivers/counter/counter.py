"""A counter: one way to take readings or time stamps in any dialect over any link."""

from __future__ import annotations

import hashlib
import re
import time
from collections.abc import Callable
from typing import Literal, NamedTuple

import numpy as np

from benchtool.errors import UsageError
from benchtool.instruments import Armed, Order, Progress
from benchtool.model.arrays import AnyArray
from benchtool.model.capture import Capture, Origin, StructurePoint
from benchtool.model.counted import Counted, CountedName, Readings
from benchtool.model.quantity import Notice
from benchtool_drivers.counter.edges import capture_of, periods_of, read_stamps
from benchtool_drivers.counter.masking import checked, masked
from benchtool_drivers.counter.session import Session
from benchtool_drivers.counter.taking import Batch, take
from benchtool_drivers.dialect.counters import READING_UNITS, TIMES
from benchtool_drivers.dialect.counting import CounterKeys
from benchtool_drivers.dialect.records import Dialect
from benchtool_drivers.digitiser.settings import Settings
from benchtool_drivers.digitiser.talk import Talk, Tell
from benchtool_drivers.link import ExchangeLog, Link

_Gate = tuple[Literal["interval", "gate"], float | None]


class _Run(NamedTuple):
    """What one run gave: readings, what was noticed, the hash of all that came."""

    readings: dict[CountedName, Readings]
    notices: tuple[Notice, ...]
    sha256: str


class Counter:
    """An instrument that counts; opened by ``open_instrument``.

    A dialect with functions delivers readings, one with stamps of both directions a capture of
    edges. What is counted, and how often, is set and put back; level, coupling and gate stay as
    the user set them. A run that fails gives an error and nothing else.

    Args:
        link: An open link; it belongs to the counter from now on.
        dialect: A dialect of kind "counter".
        chosen: How the dialect was come by, for the report.
        tell: Is told each step.
        log: A log that belongs to it, and is closed with it.
    """

    def __init__(
        self,
        link: Link,
        dialect: Dialect,
        *,
        chosen: str = "",
        tell: Tell | None = None,
        log: ExchangeLog | None = None,
    ) -> None:
        self._link = link
        self._dialect = dialect
        self._body: CounterKeys = dialect.body
        self._chosen = chosen
        self._log = log
        self._talk = Talk(link, dialect, tell)
        self._session = Session(link, self._talk)
        self._settings = Settings(self._talk)

    @property
    def resource(self) -> str:
        """The connection, as the user named it."""
        return self._link.resource

    @property
    def identity(self) -> str:
        """What it answers when asked who it is."""
        return self._link.identity

    @property
    def dialect(self) -> str:
        """Name of its dialect."""
        return self._dialect.name

    @property
    def channels(self) -> tuple[str, ...]:
        """Names of its inputs, as the dialect has them."""
        return self._dialect.channel.names

    @property
    def functions(self) -> tuple[CountedName, ...]:
        """What it can count; nothing where it delivers stamps."""
        return tuple(self._body.functions)

    @property
    def delivers(self) -> Literal["readings", "edges"]:
        """Whether ``count`` or ``acquire`` gives what it has."""
        stamps = self._body.stamps
        return "edges" if stamps is not None and stamps.edges in ("both", "levels") else "readings"

    def settings(self) -> tuple[tuple[str, str], ...]:
        """Return the settings that its dialect knows how to read, each query with its answer."""
        points, _ = self._settings.read((self._channel(Order()),))
        return tuple((point.evidence, point.value) for point in points)

    def count(
        self, order: Order, *, progress: Progress | None = None, armed: Armed | None = None
    ) -> Counted:
        """Return the readings of each function asked for.

        Args:
            order: Input, functions, number of readings, how long to wait.
            progress: Is told readings behind and in all.
            armed: Is told once the counter waits.

        Raises:
            UsageError: If the dialect does not offer what is asked for.
            InstrumentError: As the tree in ``benchtool.errors`` says; nothing is returned then.
        """
        if self.delivers == "edges":
            raise UsageError(
                f"the dialect {self.dialect} delivers time stamps of edges, not readings",
                hint="Acquire a capture of it.",
                code="counter-delivers-edges",
            )
        channel, names = self._channel(order), self._asked(order)
        start_ns = time.time_ns()
        with self._session.run(order, channel) as notices:
            resolution_s = self._resolution(channel)
            found, unread = self._settings.read((channel,))
            if self._body.stamps is None:
                run = self._count_functions(names, channel, order, progress, armed)
            else:
                stamped = read_stamps(self._talk, channel, order, resolution_s, progress, armed)
                periods = periods_of(stamped, self._talk)
                run = _Run({"period": periods}, stamped.notices, _sha256(stamped.raw))
        return Counted(
            source=self.resource,
            identity=self.identity,
            dialect=self.dialect,
            channel=channel,
            readings=run.readings,
            resolution_s=resolution_s,
            start_ns=start_ns,
            sha256=run.sha256,
            settings=tuple((point.evidence, point.value) for point in found),
            warnings=tuple(dict.fromkeys((*notices, *unread, *run.notices))),
        )

    def _count_functions(
        self,
        names: tuple[CountedName, ...],
        channel: str,
        order: Order,
        progress: Progress | None,
        armed: Armed | None,
    ) -> _Run:
        """Take the readings of one function after the other."""
        n, content = order.readings or self._body.take.n, b""
        told = _parts_of(progress, n * len(names))
        readings: dict[CountedName, Readings] = {}
        notices: list[Notice] = []
        for k, name in enumerate(names):
            batch = Batch(channel=channel, function=self._body.functions[name].word, n=n)
            raw = take(self._talk, batch, order, told(k * n), armed if k == 0 else None)
            content += raw.tobytes()
            readings[name] = self._readings(name, raw, channel, notices)
        return _Run(readings, tuple(notices), _sha256(content))

    def acquire(
        self, order: Order, *, progress: Progress | None = None, armed: Armed | None = None
    ) -> Capture:
        """Return the edges that were stamped, as a capture of one logic trace.

        Raises:
            UsageError: If it delivers readings (``counter-delivers-readings``), or the dialect does
                not offer what is asked for.
            InstrumentError: As the tree in ``benchtool.errors`` says; nothing is returned then.
        """
        if self.delivers == "readings":
            raise UsageError(
                f"the dialect {self.dialect} delivers a counter's readings, not a record",
                hint="Take readings: benchtool acquire does, and writes them for measure.",
                code="counter-delivers-readings",
            )
        channel, start_ns = self._channel(order), time.time_ns()
        with self._session.run(order, channel) as notices:
            resolution_s = self._resolution(channel)
            found, unread = self._settings.read((channel,))
            stamped = read_stamps(self._talk, channel, order, resolution_s, progress, armed)
        origin = Origin(
            source=self.resource,
            format="instrument",
            sha256="",
            start_ns=start_ns,
            instrument=self.identity,
        )
        spoken = StructurePoint(
            name="dialect", value=self.dialect, evidence=self._chosen or "given", sure="stated"
        )
        return capture_of(stamped, origin, (spoken, *found), (*notices, *unread))

    def close(self) -> None:
        """End the connection, with what was set put back as it was found."""
        self._session.close()
        if self._log is not None:
            self._log.close()

    def _channel(self, order: Order) -> str:
        keys = self._dialect.channel
        if len(order.channels) > 1:
            raise UsageError("a counter counts one input at a time", hint="Name one channel of it.")
        wanted = (order.channels or keys.default or keys.names)[0]
        if wanted not in keys.names:
            raise UsageError(
                f"the dialect {self.dialect} knows no channel {wanted!r}",
                hint=f"Its channels are {', '.join(keys.names)}.",
                code="no-such-channel",
            )
        return wanted

    def _asked(self, order: Order) -> tuple[CountedName, ...]:
        if not order.functions:
            return self.functions
        unknown = [name for name in order.functions if name not in self._body.functions]
        if unknown:
            known = ", ".join(self.functions) or "none: it stamps edges"
            raise UsageError(
                f"the dialect {self.dialect} has no function {unknown[0]!r}",
                hint=f"Its functions are {known}.",
                code="no-such-function",
            )
        return tuple(name for name in self.functions if name in order.functions)

    def _readings(
        self, name: CountedName, raw: AnyArray, channel: str, own: list[Notice]
    ) -> Readings:
        keys, query = self._body.functions[name], self._body.data.query
        values, n_missing, notices = masked(self._talk, raw, name, query)
        values = values * READING_UNITS[name][keys.unit]
        checked(self._talk, values, name, query)
        own += notices
        per, gate_s = self._gate(name, channel) if keys.per == "gate" else ("interval", None)
        if gate_s is not None and name in ("period", "frequency"):
            shortest_s = values.min() if name == "period" else 1 / values.max()
            per = "interval" if gate_s < shortest_s else "gate"  # over before the period: it is one
        return Readings(values=values, per=per, gate_s=gate_s, n_missing=n_missing)

    def _gate(self, name: CountedName, channel: str) -> _Gate:
        """Return whether a gate is open over several periods, and how long where that is known."""
        gate = self._body.gate
        if gate is None:
            return "gate", None
        word = self._body.functions[name].word
        query = gate.query.format(channel=channel, function=word)
        answer = self._talk.ask(query, "the gate")
        if gate.single and re.search(gate.single, answer):
            return "interval", None
        gate_s = self._talk.number(answer, "the gate", query) * TIMES[gate.unit]
        return "gate", gate_s if np.isfinite(gate_s) and gate_s > 0 else None

    def _resolution(self, channel: str) -> float:
        keys = self._body.resolution
        if keys.s is not None:
            return keys.s
        query = keys.query.format(channel=channel)
        answer = self._talk.ask(query, "the resolution")
        step_s = self._talk.number(answer, "the resolution", query) * TIMES[keys.unit]
        if not 0 <= step_s < 1:
            raise self._talk.wrong(
                f"the resolution is {answer!r}: no step of a counter",
                hint="Compare resolution in the dialect with the manual.",
                command=query,
                expected="a step from 0 to 1 s",
                got=answer,
                code="impossible-reading",
            )
        return step_s


def _parts_of(progress: Progress | None, total: int) -> Callable[[int], Progress | None]:
    """Return the progress of one function, as a part of all, from how many are behind."""
    if progress is None:
        return lambda _behind: None
    return lambda behind: lambda done, _of: progress(behind + done, total)


def _sha256(content: bytes) -> str:
    return hashlib.sha256(content).hexdigest()
