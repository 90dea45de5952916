"""The link: asks an instrument, and gives its answer whole or raises."""

from __future__ import annotations

import re
from collections.abc import Callable
from contextlib import suppress
from typing import TypeVar

from benchtool.errors import (
    InstrumentError,
    InstrumentTimeoutError,
    NotConnectedError,
    RefusedError,
    Step,
)
from benchtool.instruments import Progress
from benchtool_drivers.link.blocks import BlockForm, Wrap, read_block, read_lead
from benchtool_drivers.link.complaints import unreachable
from benchtool_drivers.link.conversation import NOTHING, Conversation
from benchtool_drivers.link.exchange import ExchangeLog
from benchtool_drivers.link.identity import identify
from benchtool_drivers.link.intake import Intake
from benchtool_drivers.link.lines import check_text, read_list, read_text
from benchtool_drivers.link.recovery import IDENTITY
from benchtool_drivers.link.settings import LinkSettings
from benchtool_drivers.link.wire import Patience

N_QUEUE = 32
"""More entries than an error queue has: one that never empties is not read for ever."""

_NO_QUEUE = (
    "This is the query for errors. The manual names another one, or none: error_query in the "
    'dialect\'s [link] table, error_query = "" for none.'
)

T = TypeVar("T")


class Link:
    """A connection to an instrument; opened by ``Link.open``.

    Each answer is given whole or not at all. After a failure the link is out of step; its next use
    brings it back in step, at worst through a new connection, and never through ``*RST``.

    Args:
        conversation: The exchanges beneath it.
    """

    def __init__(self, conversation: Conversation) -> None:
        self._conversation = conversation

    @classmethod
    def open(
        cls,
        resource: str,
        settings: LinkSettings | None = None,
        *,
        log: ExchangeLog | None = None,
    ) -> Link:
        """Connect, and ask the instrument who it is.

        Args:
            resource: A VISA resource string.
            settings: How it talks; the defaults where none are given.
            log: Where to write what is said.

        Returns:
            A link in step with the instrument.

        Raises:
            NotConnectedError: If nothing is there.
            InstrumentTimeoutError: If what is there does not answer.
            DriverMissingError: If a library for this kind of connection is missing.
        """
        conversation = Conversation(resource, settings or LinkSettings(), log)
        link = cls(conversation)
        try:
            conversation.identity = identify(resource, link.ask, conversation.doubt)
        except NotConnectedError as error:
            link.close()
            raise unreachable(error.__cause__ or error, resource) from error
        except BaseException:
            link.close()
            raise
        return link

    @property
    def resource(self) -> str:
        """The connection, as the user named it."""
        return self._conversation.resource

    @property
    def identity(self) -> str:
        """What the instrument answers when asked who it is."""
        return self._conversation.identity

    @property
    def last_good(self) -> str:
        """The last exchange that worked."""
        return self._conversation.last_good

    @property
    def settings(self) -> LinkSettings:
        """How the instrument talks."""
        return self._conversation.settings

    def use(self, settings: LinkSettings) -> None:
        """Talk by other settings from now on."""
        self._conversation.settings = settings

    @property
    def reopened(self) -> bool:
        """Whether there was a new connection since this was last asked.

        The instrument may have lost what was set: set it up again. Call ``recover`` before, or the
        new connection is not made before the next command.
        """
        was, self._conversation.reopened = self._conversation.reopened, False
        return was

    def send(self, command: str) -> None:
        """Send a command that is not answered."""
        self._converse(command, "no answer", lambda _: None)

    def ask(self, command: str, *, match: str | None = None, timeout_s: float | None = None) -> str:
        """Return one text answer without its terminator.

        Args:
            command: The query.
            match: A regular expression that the answer must fit.
            timeout_s: The longest silence, where the link's own does not suit.

        Raises:
            ReplyError: If the answer is no text, or does not fit.
        """
        silence_s = self.settings.timeout_s if timeout_s is None else timeout_s

        def read(intake: Intake) -> str:
            text = read_text(intake, self.settings, self._patience(silence_s, silence_s))
            check_text(text, command, match, echo=self.settings.echo)
            return text

        return self._converse(command, f"text like {match}" if match else "a line of text", read)

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
        """Return the data of a block, whole.

        Args:
            command: The query.
            n_bytes: How many bytes of data are to come, where that is known.
            wrap: The form of the block, as ``link.blocks`` says.
            trailer: What follows the data.
            length_unit_bytes: What one of the header's count stands for.
            progress: Is told bytes behind and in all.

        Raises:
            ReplyError: If header, count, checksum or trailer is not as it must be.
            InstrumentTimeoutError: If not all of it came in time.
        """
        form = BlockForm(
            wrap=wrap,
            trailer=trailer.encode("ascii"),
            n_bytes=n_bytes,
            length_unit_bytes=length_unit_bytes,
        )
        expected = f"a {wrap} block" + ("" if n_bytes is None else f" of {n_bytes} bytes")

        def read(intake: Intake) -> bytes:
            return read_block(intake, form, self._block_patience(), progress)

        return self._converse(command, expected, read)

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
        """Return the text that leads a block in one answer, and the data of the block, whole.

        Args:
            command: The query.
            n_bytes: How many bytes of data are to come, where that is known.
            wrap: The form of the block, as ``link.blocks`` says.
            trailer: What follows the data.
            length_unit_bytes: What one of the header's count stands for.
            progress: Is told bytes behind and in all.

        Raises:
            ReplyError: If no block follows, or it is not as ``ask_block`` wants it.
            InstrumentTimeoutError: If not all of it came in time.
        """
        form = BlockForm(
            wrap=wrap,
            trailer=trailer.encode("ascii"),
            n_bytes=n_bytes,
            length_unit_bytes=length_unit_bytes,
        )

        def read(intake: Intake) -> tuple[str, bytes]:
            patience = self._block_patience()
            lead = read_lead(intake, form, patience)
            return lead, read_block(intake, form, patience, progress)

        return self._converse(command, "a text and a block", read)

    def ask_text_list(self, command: str, *, progress: Progress | None = None) -> bytes:
        """Return a long text answer as it came, without its terminator."""

        def read(intake: Intake) -> bytes:
            return read_list(intake, self.settings, self._block_patience(), progress)

        return self._converse(command, "a list of numbers", read)

    def ask_raw(self, command: str, n_bytes: int) -> bytes:
        """Return the first bytes of an answer; what follows them is dropped at the next use."""

        def read(intake: Intake) -> bytes:
            return intake.take(n_bytes, self._block_patience())

        return self._converse(command, f"{n_bytes} bytes", read, leave_rest=True)

    def errors(self) -> tuple[str, ...]:
        """Read the error queue until it is empty, and return what was in it, oldest first."""
        query = self.settings.error_query
        found: list[str] = []
        while query is not None and len(found) < N_QUEUE:
            try:
                entry = self.ask(query)
            except InstrumentTimeoutError as silence:
                silence.hint = _NO_QUEUE
                raise
            if re.search(self.settings.error_none, entry):
                break
            found.append(entry.strip())
        return tuple(found)

    def recover(self) -> None:
        """Bring the link back in step now, where it is not; its next use would do so anyway.

        Raises:
            NotConnectedError: If not even a new connection helps.
        """
        self._conversation.in_step()

    def close(self) -> None:
        """End the connection."""
        self._conversation.close()

    def _converse(
        self,
        command: str,
        expected: str,
        read: Callable[[Intake], T],
        *,
        leave_rest: bool = False,
    ) -> T:
        try:
            return self._conversation.hold(command, expected, read, leave_rest=leave_rest)
        except InstrumentTimeoutError as silence:
            entries = self._asked_why(silence.step)
            if not entries:
                raise
            raise RefusedError(
                f"No answer to {command}, and the instrument reports {'; '.join(entries)}.",
                hint="The instrument does not know this command, or not in this state.",
                step=silence.step,
            ) from silence

    def _asked_why(self, step: Step) -> tuple[str, ...]:
        """Look in the error queue for the reason that nothing came."""
        asked_already = step.command in (IDENTITY, self.settings.error_query)
        if step.got != NOTHING or asked_already or not self.identity:
            return ()
        with suppress(InstrumentError):
            if self._conversation.resynchronised():
                return self.errors()
        return ()

    def _patience(self, first_s: float, next_s: float) -> Patience:
        return Patience(first_s, next_s, self.settings.deadline_s)

    def _block_patience(self) -> Patience:
        return self._patience(self.settings.block_timeout_s, self.settings.timeout_s)
