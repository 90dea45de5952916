"""Speaking a dialect over a link: commands filled in, answers freed of headers, all of it told."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Iterator
from contextlib import contextmanager
from typing import Protocol

from benchtool.errors import InstrumentError, RefusedError, ReplyError, Step
from benchtool.frozen import frozen_record
from benchtool.instruments import Progress
from benchtool_drivers.dialect.records import Dialect
from benchtool_drivers.digitiser.numerals import has_decimal_comma, read_number
from benchtool_drivers.link.blocks import Wrap

_SHOWN = 60
_ESR = {4: "query error", 8: "device error", 16: "execution error", 32: "command error"}
"""Bits of the standard event status register (IEEE 488.2-1992, 11.5.1)."""


@frozen_record
class Told:
    """One step of an exchange, for whoever looks on.

    Attributes:
        kind: ``sent``, ``asked``, ``field``, ``block``, ``note``.
        command: The command, or the name of the field.
        answer: What came back, or the value of the field.
        meaning: What it means, in a few words.
    """

    kind: str
    command: str
    answer: str = ""
    meaning: str = ""


Tell = Callable[[Told], None]


_BUSY = (
    "It is busy with an acquisition of its own: stop it at its front, or wait for its end, and "
    "try again."
)
"""What helps after -213, Init ignored (SCPI-1999, volume 2, SYSTem:ERRor)."""
_REFUSED = (
    "Compare the commands of the dialect with the manual: `benchtool instruments try` shows each "
    "one."
)


class Speaker(Protocol):
    """What is needed of a link."""

    @property
    def resource(self) -> str:
        """The connection, as the user named it."""
        ...

    @property
    def last_good(self) -> str:
        """The last exchange that worked."""
        ...

    def send(self, command: str) -> None:
        """Send a command that is not answered."""
        ...

    def ask(self, command: str, *, match: str | None = None, timeout_s: float | None = None) -> str:
        """Return one text answer."""
        ...

    def ask_block(
        self,
        command: str,
        *,
        n_bytes: int | None = None,
        wrap: Wrap = "definite",
        trailer: str = "\n",
        length_unit_bytes: int = 1,
        progress: Progress | None = None,
    ) -> bytes:
        """Return the data of a block, whole."""
        ...

    def ask_led_block(
        self,
        command: str,
        *,
        n_bytes: int | None = None,
        wrap: Wrap = "definite",
        trailer: str = "\n",
        length_unit_bytes: int = 1,
        progress: Progress | None = None,
    ) -> tuple[str, bytes]:
        """Return the text that leads a block, and the block."""
        ...

    def ask_text_list(self, command: str, *, progress: Progress | None = None) -> bytes:
        """Return a long text answer."""
        ...

    def errors(self) -> tuple[str, ...]:
        """Read the error queue until it is empty."""
        ...


class Talk:
    """A dialect spoken over a link.

    Args:
        link: The link.
        dialect: The dialect.
        tell: Is told each step.
    """

    def __init__(self, link: Speaker, dialect: Dialect, tell: Tell | None = None) -> None:
        self.link = link
        self.dialect = dialect
        self._tell = tell

    def tell(self, kind: str, command: str, answer: str = "", meaning: str = "") -> None:
        """Tell a step to whoever looks on."""
        if self._tell is not None:
            self._tell(Told(kind=kind, command=command, answer=answer, meaning=meaning))

    def send(self, commands: Iterable[str], meaning: str, **values: object) -> None:
        """Send commands in their order."""
        for template in commands:
            command = template.format(**values)
            self.link.send(command)
            self.tell("sent", command, meaning=meaning)

    def ask(
        self,
        query: str,
        meaning: str = "",
        *,
        timeout_s: float | None = None,
        match: str | None = None,
        **values: object,
    ) -> str:
        """Return a text answer, freed of the header that some instruments put before it."""
        command = query.format(**values)
        with self.told_if_failing(command, meaning):
            said = self.link.ask(command, timeout_s=timeout_s)
            answer = self.dialect.link.plain(said, command)
        if match and not re.search(match, answer):
            self.tell("asked", command, answer, meaning)
            raise self.wrong(
                f"{command} answers {cut(answer)!r}, which does not fit {match!r}",
                hint="Compare the pattern in the dialect file with the manual.",
                command=command,
                expected=f"a text like {match}",
                got=answer,
            )
        self.tell("asked", command, answer, meaning)
        return answer

    @contextmanager
    def told_if_failing(self, command: str, meaning: str) -> Iterator[None]:
        """Tell of a command that is about to end in an error."""
        try:
            yield
        except InstrumentError as error:
            self.tell("asked", command, f"({error.message})", meaning)
            raise

    def errors(self) -> tuple[str, ...]:
        """Read the error queue until it is empty."""
        if not self.dialect.link.error_query:
            return ()
        found = tuple(map(self._worded, self.link.errors()))
        self.tell("asked", self.dialect.link.error_query, "; ".join(found) or "no error", "errors")
        return found

    def _worded(self, entry: str) -> str:
        """Return an entry of the queue; of a register, what its bits mean."""
        if self.dialect.link.error_bits is None or not entry.isdecimal():
            return entry
        named = [name for bit, name in _ESR.items() if int(entry) & bit]
        return f"{entry} ({', '.join(named)})" if named else entry

    def refuse_errors(self, after: str, command: str = "") -> None:
        """Raise what the error queue holds.

        Args:
            after: What was done.
            command: The command that did it, where it was one.

        Raises:
            RefusedError: If it holds something.
        """
        entries = self.errors()
        if entries:
            raise RefusedError(
                f"after {after} the instrument reports {'; '.join(entries)}",
                hint="Nothing was kept of this record. "
                + (_BUSY if entries[0].startswith("-213") else _REFUSED),
                step=self.step(
                    command or after, expected="an empty error queue", got="; ".join(entries)
                ),
            )

    def number(self, text: str, what: str, command: str) -> float:
        """Return the number in an answer.

        Raises:
            ReplyError: If it is none.
        """
        try:
            return read_number(text, self.dialect.link.decimal)
        except ValueError:
            pass
        comma = has_decimal_comma(text)
        raise self.wrong(
            f"{what} is {cut(text)!r}, "
            + ("which looks like a decimal comma" if comma else "which is no number"),
            hint='If it is one: decimal = "," in [link].'
            if comma
            else "Compare the dialect's preamble with the manual.",
            command=command,
            expected="a number",
            got=text,
        )

    def wrong(
        self,
        message: str,
        *,
        hint: str,
        command: str,
        expected: str = "",
        got: str = "",
        code: str | None = None,
    ) -> ReplyError:
        """Return the error of an answer that is not what was to come."""
        return ReplyError(
            message, hint=hint, step=self.step(command, expected=expected, got=got), code=code
        )

    def step(self, command: str, *, expected: str = "", got: str = "") -> Step:
        """Return where the exchange stands."""
        return Step(
            resource=self.link.resource,
            command=command,
            expected=expected,
            got=cut(got),
            last_good=self.link.last_good,
        )


def cut(text: str) -> str:
    """Return a text short enough for a message."""
    return text if len(text) <= _SHOWN else text[: _SHOWN - 2] + ".."
