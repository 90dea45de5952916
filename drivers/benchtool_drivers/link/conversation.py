"""One exchange after another over a wire, and back in step after one that failed."""

from __future__ import annotations

import time
from collections.abc import Callable
from contextlib import suppress
from typing import TypeVar

from benchtool.errors import NotConnectedError, Step
from benchtool_drivers.link.addresses import check_resource
from benchtool_drivers.link.complaints import beginning, complaint, too_much, unreachable
from benchtool_drivers.link.connecting import connect
from benchtool_drivers.link.exchange import ExchangeLog
from benchtool_drivers.link.intake import FIRST_BYTES, Intake
from benchtool_drivers.link.lines import encoded, read_echo, read_prompt
from benchtool_drivers.link.recovery import IDENTITY, calm, resynchronise
from benchtool_drivers.link.settings import LinkSettings
from benchtool_drivers.link.text import printable
from benchtool_drivers.link.wire import Wire

T = TypeVar("T")

NOTHING = "nothing"
"""What a step says came, where nothing came."""


class Conversation:
    """Says commands and reads answers, and knows whether it is in step with the instrument.

    Args:
        resource: A VISA resource string.
        settings: How the instrument talks.
        log: Where exchanges are written.

    Attributes:
        resource: The connection, as the user named it.
        settings: How the instrument talks.
        identity: What it answers when asked who it is; empty as long as nobody knows.
        last_good: The last exchange that worked.
        reopened: Whether there was a new connection since this was last set to False.

    Raises:
        NotConnectedError: If nothing is there.
        DriverMissingError: If a library for this kind of connection is missing.
    """

    def __init__(self, resource: str, settings: LinkSettings, log: ExchangeLog | None) -> None:
        self.resource = resource
        self.settings = settings
        self.identity = ""
        self.last_good = ""
        self.reopened = False
        self._log = log
        self._dirty = False
        self._told = False
        self._closed = False
        self._wire: Wire | None = _connected(resource, settings)

    def close(self) -> None:
        """End the connection."""
        self._closed = True
        if self._wire is not None:
            self._wire.close()
            self._wire = None

    def hold(
        self,
        command: str,
        expected: str,
        read: Callable[[Intake], T],
        *,
        leave_rest: bool = False,
    ) -> T:
        """Do one exchange: say the command, and read its answer.

        Args:
            command: What to say.
            expected: What is to come back, for the error that may be raised.
            read: Reads the answer.
            leave_rest: Whether part of the answer may be left unread; it is dropped later.

        Raises:
            InstrumentError: With the step filled in; the link is out of step then.
        """
        line = encoded(command, self.settings)
        wire = self.in_step()
        intake = Intake(wire, whole=self._log is not None and self._log.whole)
        began_s = time.monotonic()
        self._dirty = True
        try:
            wire.write(line, self.settings.timeout_s)
            read_echo(intake, command, self.settings)
            if self.settings.query_delay_s:
                time.sleep(self.settings.query_delay_s)
            answer = read(intake)
            rest = self._finish(intake, leave_rest=leave_rest)
        except Exception as error:
            wrong = self._failure(error, command, expected, intake, began_s)
            if wrong is error:
                raise
            raise wrong from error
        except BaseException:  # the user interrupted, and knows
            self._told = True
            raise
        self._dirty = rest
        self._write_log(command, intake, began_s)
        got = printable(intake.kept[:FIRST_BYTES])
        self.last_good = f"{command} -> {got}" if got else command
        return answer

    def _finish(self, intake: Intake, *, leave_rest: bool) -> bool:
        """Read the prompt; return whether part of the answer is left, which must be allowed."""
        if self.settings.prompt and not intake.wire.has_end:
            read_prompt(intake, self.settings)
        if not intake.n_bytes:
            return False
        if intake.wire.has_end:
            rest = not intake.ended
        else:
            rest = bool(intake.held) or intake.wire.unasked()
        if rest and not leave_rest:
            raise too_much(bytes(intake.held[:FIRST_BYTES]))
        return rest

    def _failure(
        self, error: Exception, command: str, expected: str, intake: Intake, began_s: float
    ) -> Exception:
        """Return the error to raise, and write it to the log."""
        step = Step(
            resource=self.resource,
            command=command,
            expected=expected,
            got=beginning(intake.kept) or NOTHING,
            last_good=self.last_good,
        )
        wrong = complaint(error, step, intake.n_bytes)
        self._write_log(
            command, intake, began_s, error=type(error).__name__ if wrong is None else wrong.code
        )
        if wrong is None:
            return error
        self._told = True
        return wrong

    def resynchronised(self) -> bool:
        """Bring the connection back in step without a new one; return whether that worked."""
        wire = self._wire
        if wire is None or not resynchronise(wire, self.settings, self.identity):
            return False
        self._dirty = self._told = False
        self._note("resynchronised")
        return True

    def doubt(self) -> None:
        """Take the connection to be out of step: its next use brings it back."""
        self._dirty = True

    def _calmed(self, wire: Wire) -> bool:
        """Do what can be done while nobody knows who the instrument is."""
        with suppress(Exception):  # as in recovery, whatever a library raises
            self._dirty = not calm(wire, self.settings)
        return not self._dirty

    def in_step(self) -> Wire:
        """Return the wire, brought back in step where it is not.

        A connection that has gone is only made anew once its loss was told: otherwise the
        settings of a capture could be lost in its middle without anybody knowing.
        """
        if self._closed:
            raise NotConnectedError(
                f"The connection to {self.resource} was closed.",
                hint="Open it again.",
                step=Step(resource=self.resource, last_good=self.last_good),
            )
        wire = self._wire
        if wire is not None and not self._dirty and not _speaks_unasked(wire):
            return wire
        if wire is not None and (self.resynchronised() if self.identity else self._calmed(wire)):
            return wire
        told, self._told, self._dirty = self._told, True, True
        if not told:
            raise NotConnectedError(
                f"The connection to {self.resource} was lost.",
                hint="Try again: a new connection is made then, and set-up may have to be redone.",
                step=Step(resource=self.resource, last_good=self.last_good),
            )
        return self._connected_anew()

    def _connected_anew(self) -> Wire:
        if self._wire is not None:
            self._wire.close()
            self._wire = None
        wire = _connected(self.resource, self.settings)
        if not resynchronise(wire, self.settings, self.identity):
            wire.close()
            raise NotConnectedError(
                f"{self.resource} does not answer as before after a new connection was made.",
                hint="Is it still the same instrument? Switch it off and on, and open it again.",
                step=Step(
                    resource=self.resource,
                    command=IDENTITY,
                    expected=self.identity,
                    last_good=self.last_good,
                ),
            )
        self._wire, self._dirty, self._told, self.reopened = wire, False, False, True
        self._note("connected anew")
        return wire

    def _note(self, text: str) -> None:
        if self._log is not None:
            self._log.note(self.resource, text)

    def _write_log(self, command: str, intake: Intake, began_s: float, *, error: str = "") -> None:
        if self._log is not None:
            self._log.exchange(
                self.resource,
                command,
                answer=intake.kept,
                n_bytes=intake.n_bytes,
                began_s=began_s,
                error=error,
            )


def _connected(resource: str, settings: LinkSettings) -> Wire:
    check_resource(resource)
    try:
        return connect(resource, settings.timeout_s, settings.baud)
    except Exception as error:
        raise unreachable(error, resource) from error


def _speaks_unasked(wire: Wire) -> bool:
    try:
        return wire.unasked()
    except OSError:
        return True
