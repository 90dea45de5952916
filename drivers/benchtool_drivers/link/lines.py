"""Text answers, and what some instruments print around them."""

from __future__ import annotations

import re

from benchtool.errors import ReplyError, UsageError
from benchtool.instruments import Progress
from benchtool_drivers.link.intake import Intake
from benchtool_drivers.link.settings import LinkSettings
from benchtool_drivers.link.text import printable
from benchtool_drivers.link.wire import Patience

LONGEST_LINE_BYTES = 1 << 20
_CONTROL = re.compile(r"[\x00-\x08\x0a-\x1f\x7f]")


def encoded(command: str, settings: LinkSettings) -> bytes:
    """Return a command as the bytes that are sent.

    Raises:
        UsageError: If it holds anything but printable ASCII.
    """
    if not command or not command.isascii() or not command.isprintable():
        raise UsageError(
            f"The command {command!r} holds a character that cannot be sent.",
            hint="Commands are one line of printable ASCII.",
        )
    return (command + settings.write_termination).encode("ascii")


def read_text(intake: Intake, settings: LinkSettings, patience: Patience) -> str:
    """Return one text answer without its terminator."""
    terminator = settings.read_termination.encode("ascii")
    if intake.wire.has_end:
        raw = intake.message(terminator, patience)
    else:
        raw = intake.line(terminator, patience, longest=LONGEST_LINE_BYTES)
    return raw.decode("latin-1").rstrip("\r\n")


def check_text(text: str, command: str, match: str | None, *, echo: bool) -> None:
    """Refuse an answer that is no text, repeats the command, or does not fit.

    Raises:
        ReplyError: If so.
    """
    shown = printable(text.encode("latin-1")[:64]) or "an empty line"
    if _CONTROL.search(text):
        raise ReplyError(
            f"The answer to {command} is no line of text: {shown}.",
            hint="An answer to an earlier command may have come late: try again.",
        )
    if not echo and text.strip() == command.strip():
        raise ReplyError(
            f"The instrument repeats the command {command} before it answers.",
            hint="Say so in the dialect: echo = true in its [link] table.",
        )
    if match is not None and not re.search(match, text):
        raise ReplyError(
            f"The answer to {command} is {shown}, where text like {match} is to come.",
            hint="An answer to an earlier command may have come late: try again. If it stays so, "
            "the dialect does not fit this instrument.",
        )


def read_list(
    intake: Intake, settings: LinkSettings, patience: Patience, progress: Progress | None
) -> bytes:
    """Return a long text answer as it came, without its terminator."""
    terminator = settings.read_termination.encode("ascii")

    def shown(n_bytes: int) -> None:
        if progress is not None:
            progress(n_bytes, 0)

    if intake.wire.has_end:
        return intake.message(terminator, patience, shown).rstrip(b"\r\n")
    return intake.line(terminator, patience, told=shown).rstrip(b"\r\n")


def read_echo(intake: Intake, command: str, settings: LinkSettings) -> None:
    """Read the command's repetition, where the instrument repeats commands.

    Raises:
        ReplyError: If something else comes.
    """
    if not settings.echo or intake.wire.has_end:
        return
    patience = Patience(settings.timeout_s, settings.timeout_s)
    line = intake.line(b"\n", patience, longest=LONGEST_LINE_BYTES)
    if line.strip() != command.strip().encode("ascii"):
        raise ReplyError(
            f"In place of the repeated command {command} comes {printable(line[:64])}.",
            hint="Does this instrument repeat commands? The dialect says so.",
        )


def read_prompt(intake: Intake, settings: LinkSettings) -> None:
    """Read the prompt that follows each exchange.

    Raises:
        ReplyError: If something else comes.
    """
    wanted = settings.prompt.encode("ascii")
    got = intake.take(len(wanted), Patience(settings.timeout_s, settings.timeout_s))
    if got != wanted:
        raise ReplyError(
            f"In place of the prompt {printable(wanted)} comes {printable(got)}.",
            hint="Does this instrument print that prompt? The dialect says so.",
        )
