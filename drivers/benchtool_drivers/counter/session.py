"""What goes on round the readings: set-up, what the user asked to set, putting back."""

from __future__ import annotations

import re
from collections.abc import Iterator
from contextlib import contextmanager, suppress

from benchtool.errors import InstrumentError, NotConnectedError
from benchtool.instruments import Order
from benchtool.model.quantity import Notice
from benchtool_drivers.dialect.records import AcquireKeys
from benchtool_drivers.digitiser.orders import check_order
from benchtool_drivers.digitiser.talk import Talk
from benchtool_drivers.link import Link


class Session:
    """A connection that is set up once, anew after a failure, and put back at the end.

    Args:
        link: The link.
        talk: The dialect spoken over it.
    """

    def __init__(self, link: Link, talk: Talk) -> None:
        self._link = link
        self._talk = talk
        self._ready = False
        self._kept: list[str] = []

    @contextmanager
    def run(self, order: Order, channel: str) -> Iterator[tuple[Notice, ...]]:
        """Set up, and yield what was noticed; set up anew after whatever does not end well.

        Raises:
            UsageError: If the order asks for what the dialect does not offer.
            RefusedError: If the instrument reports an error.
        """
        check_order(self._talk.dialect, order)
        try:
            notices = self._begin(channel)
            self._set(order.settings)
            with self._left_running():
                yield notices
                self._talk.refuse_errors("the readings")
        except BaseException:
            self._ready = False
            raise

    def close(self) -> None:
        """Put back what was found, and end the connection."""
        with suppress(InstrumentError):
            for command in self._kept:
                self._link.send(command)
            if self._kept:
                self._talk.errors()  # what is answered was heard: only then is the line cut
        self._kept.clear()
        self._link.close()

    def _begin(self, channel: str) -> tuple[Notice, ...]:
        self._link.recover()
        notices = []
        if self._link.reopened:
            self._ready = False
            text = (
                f"the connection to {self._link.resource} had gone and was made anew; the "
                "instrument was set up again"
            )
            notices.append(Notice(code="connection-renewed", text=text))
        leftovers = self._talk.errors()
        if leftovers:
            text = "the instrument still reported errors from before: " + "; ".join(leftovers[:4])
            notices.append(Notice(code="earlier-errors", text=text))
        if not self._ready:
            self._set_up(channel)
            self._ready = True
        return tuple(notices)

    def _set_up(self, channel: str) -> None:
        talk, keys = self._talk, self._talk.dialect.setup
        talk.send(talk.dialect.link.header_off, "make answers plain")
        if not self._kept:
            for kept in keys.keep:
                answer = talk.ask(kept.query, "to be put back at the end", channel=channel)
                if answer.isascii() and answer.isprintable():
                    self._kept.append(f"{kept.set.format(channel=channel)} {answer.strip()}")
        talk.send(keys.commands, "agree on the transfer", channel=channel)
        if keys.commands or talk.dialect.link.header_off:
            talk.refuse_errors("setting up the transfer")
        for question in keys.verify:
            talk.ask(question.query, "is it so?", match=question.match, channel=channel)

    def _set(self, commands: tuple[str, ...]) -> None:
        for command in commands:
            self._link.send(command)
            self._talk.tell("sent", command, meaning="as you asked")
        if commands:
            self._talk.refuse_errors("the settings that you gave")

    @contextmanager
    def _left_running(self) -> Iterator[None]:
        """Stop a counter that runs by itself, and let it run again afterwards."""
        acquire: AcquireKeys = self._talk.dialect.body.acquire
        running = False
        if acquire.running is not None:
            answer = self._talk.ask(acquire.running.query, "does it run by itself?")
            running = re.search(acquire.running.match, answer) is not None
        if running or acquire.running is None:
            self._talk.send(acquire.stop, "stop it")
        try:
            yield
        except NotConnectedError:
            raise
        except BaseException:
            if running:
                with suppress(InstrumentError):
                    self._talk.send(acquire.resume, "let it run again")
            raise
        if running:
            self._talk.send(acquire.resume, "let it run again")
