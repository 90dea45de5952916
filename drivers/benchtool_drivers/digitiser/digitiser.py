"""A digitising instrument: one way to read a record in any dialect over any link."""

from __future__ import annotations

import hashlib
import re
import time
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from dataclasses import replace

from benchtool.errors import (
    InstrumentError,
    NotConnectedError,
)
from benchtool.instruments import Armed, Order, Progress
from benchtool.model.capture import Capture, Origin, StructurePoint
from benchtool.model.quantity import Notice
from benchtool_drivers.dialect.records import AcquireKeys, Dialect, SetupKeys
from benchtool_drivers.digitiser.orders import channels_of, check_order
from benchtool_drivers.digitiser.settings import Settings
from benchtool_drivers.digitiser.talk import Talk, Tell
from benchtool_drivers.digitiser.traces import Made, make_traces
from benchtool_drivers.digitiser.transfer import Transfer
from benchtool_drivers.digitiser.waiting import wait_for_end
from benchtool_drivers.link import ExchangeLog, Link


class Digitiser:
    """An instrument that delivers records; opened by ``open_instrument``.

    Only the form of the transfer is set, and put back at the end; what is measured, and how, stays
    as the user set it at the instrument. A failed record gives an error and nothing else, and the
    next one is set up anew.

    Args:
        link: An open link; it belongs to the instrument from now on.
        dialect: A dialect of kind "digitiser".
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
        self._log = log
        self._talk = Talk(link, dialect, tell)
        self._dialect = dialect
        self._chosen = chosen
        self._ready = False
        self._owes_run = False
        self._kept: list[str] = []
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
        """Names of its channels, as the dialect has them."""
        return self._dialect.channel.names

    def settings(self) -> tuple[tuple[str, str], ...]:
        """Return the settings that its dialect knows how to read, each query with its answer."""
        return tuple(
            (point.evidence, point.value)
            for point in self._settings.read(channels_of(self._dialect))[0]
        )

    def acquire(
        self, order: Order, *, progress: Progress | None = None, armed: Armed | None = None
    ) -> Capture:
        """Return one whole record.

        Raises:
            UsageError: If the order asks for what the dialect does not offer.
            InstrumentError: As the tree in ``benchtool.errors`` says; nothing is returned then.
        """
        channels = channels_of(self._dialect, order.channels)
        check_order(self._dialect, order)
        with self._whole():
            notices = self._begin()
            self._set(order.settings)
            with self._left_running():
                self._take(order, armed)
                start_ns = time.time_ns()
                found, asked = self._settings.read(channels)
                made, sha256 = self._read(channels, progress)
                self._talk.refuse_errors("the transfer")
        return self._capture(made, (*notices, *asked), found, sha256, start_ns)

    def close(self) -> None:
        """End the connection, with the form of the transfer put back as it was found."""
        with suppress(InstrumentError):
            heard = self._kept or self._owes_run
            self._run_again()
            for command in self._kept:
                self._link.send(command)
            if heard:
                self._talk.errors()  # what is answered was heard: only then is the line cut
        self._kept.clear()
        self._link.close()
        if self._log is not None:
            self._log.close()

    @contextmanager
    def _whole(self) -> Iterator[None]:
        """Set up anew after whatever does not end well."""
        try:
            yield
        except BaseException:
            self._ready = False
            raise

    def _begin(self) -> tuple[Notice, ...]:
        """Bring the instrument to where a record can be taken; return what was noticed."""
        self._link.recover()
        notices = []
        if self._link.reopened:
            self._ready = False
            notices.append(
                Notice(
                    code="connection-renewed",
                    text=f"the connection to {self.resource} had gone and was made anew; the "
                    "instrument was set up for the transfer again",
                )
            )
        leftovers = self._talk.errors()
        if leftovers:
            notices.append(
                Notice(
                    code="earlier-errors",
                    text="the instrument still reported errors from before: "
                    + "; ".join(leftovers[:4]),
                )
            )
        if not self._ready:
            self._set_up()
            self._ready = True
        return tuple(notices)

    def _set_up(self) -> None:
        talk, keys = self._talk, self._dialect.setup
        talk.send(self._dialect.link.header_off, "make answers plain")
        channel = channels_of(self._dialect)[0]
        if not self._kept:
            self._keep(keys, channel)
        talk.send(keys.commands, "agree on the transfer", channel=channel)
        if keys.commands or self._dialect.link.header_off:
            talk.refuse_errors("setting up the transfer")
        for question in keys.verify:
            talk.ask(question.query, "is it so?", match=question.match, channel=channel)

    def _keep(self, keys: SetupKeys, channel: str) -> None:
        """Note what the settings of the transfer are, to put them back at the end."""
        for kept in keys.keep:
            answer = self._talk.ask(kept.query, "to be put back at the end", channel=channel)
            if answer.isascii() and answer.isprintable():
                self._kept.append(f"{kept.set.format(channel=channel)} {answer.strip()}")

    def _set(self, commands: tuple[str, ...]) -> None:
        """Send what the user asked to be set."""
        for command in commands:
            self._link.send(command)
            self._talk.tell("sent", command, meaning="as you asked")
        if commands:
            self._talk.refuse_errors("the settings that you gave", "; ".join(commands))

    @contextmanager
    def _left_running(self) -> Iterator[None]:
        """Stop an instrument that runs by itself, and let it run again afterwards.

        Where the connection goes in between, it is owed until the next record, or the end.
        """
        talk, acquire = self._talk, self._dialect.body.acquire
        running = False
        if acquire.running is not None:
            answer = talk.ask(acquire.running.query, "does it run by itself?")
            running = re.search(acquire.running.match, answer) is not None
        self._owes_run = self._owes_run or running
        if running or acquire.running is None:
            talk.send(acquire.stop, "stop it")
        try:
            yield
        except NotConnectedError:
            raise
        except BaseException:
            with suppress(InstrumentError):
                self._run_again()
            raise
        self._run_again()

    def _run_again(self) -> None:
        if self._owes_run:
            self._talk.send(self._dialect.body.acquire.resume, "let it run again")
            self._owes_run = False

    def _take(self, order: Order, armed: Armed | None) -> None:
        """Arm and wait, where a new record is wanted."""
        acquire: AcquireKeys = self._dialect.body.acquire
        if not order.arm or not acquire.arm:
            return
        talk = self._talk
        talk.send(acquire.arm, "take one record")
        if acquire.wait.by != "opc":  # which would wait behind a query
            talk.refuse_errors("arming", "; ".join(acquire.arm))
        wait_for_end(
            talk,
            timeout_s=order.trigger_timeout_s or acquire.timeout_s,
            armed=armed,
            force=(lambda: talk.send(acquire.force, "trigger it")) if order.force else None,
        )

    def _read(self, channels: tuple[str, ...], progress: Progress | None) -> tuple[Made, str]:
        """Read all channels."""
        digest = hashlib.sha256()
        made: list[Made] = []
        together = self._dialect.channel.interleaved
        groups = [self._dialect.channel.names] if together else [(name,) for name in channels]
        for group in groups:
            transfer = Transfer(self._talk, group[0], len(group), digest.update, progress)
            made.append(make_traces(self._talk, transfer.read(), group))
        traces = tuple(trace for item in made for trace in item.traces)
        if together:
            traces = tuple(trace for trace in traces if trace.channel in channels)
        notices = tuple(notice for item in made for notice in item.notices)
        return replace(made[0], traces=traces, notices=notices), digest.hexdigest()

    def _capture(
        self,
        made: Made,
        notices: tuple[Notice, ...],
        settings: list[StructurePoint],
        sha256: str,
        start_ns: int,
    ) -> Capture:
        dialect = StructurePoint(
            name="dialect",
            value=self._dialect.name,
            evidence=self._chosen or "given",
            sure="stated",
        )
        return Capture(
            origin=Origin(
                source=self.resource,
                format="instrument",
                sha256=sha256,
                start_ns=start_ns,
                instrument=self.identity,
            ),
            traces=made.traces,
            structure=(dialect, *made.points, *settings),
            warnings=(*notices, *made.notices),
        )
