"""Turns what went wrong in an exchange into one of our errors, with the step it stood at."""

from __future__ import annotations

from benchtool.errors import (
    DriverMissingError,
    InstrumentError,
    InstrumentTimeoutError,
    NotConnectedError,
    ReplyError,
    Step,
)
from benchtool_drivers.link.addresses import unknown_host
from benchtool_drivers.link.foreign import ours
from benchtool_drivers.link.intake import FIRST_BYTES
from benchtool_drivers.link.text import printable

_LONGEST_PROMPT = 16
_LONGEST_QUOTED = 80
_FEW_BYTES = 24

HINTS: dict[type[InstrumentError], str] = {
    NotConnectedError: "Check that it is on and that its cable is in, and try again.",
    InstrumentTimeoutError: "Check the command against the manual; a slow instrument needs a "
    "longer time limit.",
    ReplyError: "Try again; if it stays so, the instrument does not follow its transport's rules.",
    DriverMissingError: "Install the library named above: USB needs `pip install benchtool[usb]`.",
}


def complaint(error: BaseException, step: Step, n_bytes: int = 0) -> InstrumentError | None:
    """Return the error to raise for one that ended an exchange.

    Args:
        error: What was raised: one of ours, or a library's.
        step: Where the exchange stood.
        n_bytes: How many bytes of the answer had come.

    Returns:
        An error with the step filled in; None for an error that is no instrument's matter.
    """
    if isinstance(error, InstrumentError):
        error.step = step
        return error
    kind = ours(error)
    if kind is None:
        return None
    return kind(_sentence(kind, error, step, n_bytes), hint=HINTS[kind], step=step)


def unreachable(error: BaseException, resource: str) -> InstrumentError:
    """Return the error to raise for a connection that could not be opened."""
    step = Step(resource=resource, command="open", expected="a connection")
    if ours(error) is DriverMissingError or "install" in str(error).lower():
        return DriverMissingError(
            f"A library that {resource} needs is not installed: {_first_line(error)}.",
            hint=HINTS[DriverMissingError],
            step=step,
        )
    host = unknown_host(resource)
    return NotConnectedError(
        f"{resource} cannot be reached: "
        + (_first_line(error) if host is None else f"no address is known for the name {host}")
        + ".",
        hint="Check the resource string, that the instrument is on and that its cable is in."
        if host is None
        else "Check how the name is written, or give the instrument's number, such as 192.0.2.7.",
        step=step,
    )


def too_much(rest: bytes) -> ReplyError:
    """Return the error to raise where more came than one answer; its rest may be a prompt."""
    prompt = rest.decode("latin-1")
    looks_so = 0 < len(prompt) <= _LONGEST_PROMPT and prompt.isprintable()
    return ReplyError(
        f"More came than one answer: {printable(rest)}.",
        hint=f"Is it what the instrument prints when it is ready? Say so in the dialect: prompt = "
        f'"{prompt}" in its [link] table. Else an earlier answer came late: try again.'
        if looks_so
        else "An answer to an earlier command may have come late: try again.",
    )


def beginning(got: bytes) -> str:
    """Return what came as a message quotes it: all of a short text, little of anything else."""
    whole = printable(got[:FIRST_BYTES])
    return whole if len(whole) <= _LONGEST_QUOTED else f"{printable(got[:_FEW_BYTES])}.."


def _sentence(kind: type[InstrumentError], error: BaseException, step: Step, n_bytes: int) -> str:
    reason = _first_line(error)
    if kind is InstrumentTimeoutError:
        if n_bytes:
            part = reason if " of " in reason else f"{n_bytes} bytes"
            return f"The answer to {step.command} stopped after {part}."
        return f"No answer to {step.command} came in time."
    if kind is NotConnectedError:
        return f"The connection was lost at {step.command}: {reason}."
    return f"The answer to {step.command} cannot be read: {reason}."


def _first_line(error: BaseException) -> str:
    text = getattr(error, "strerror", None) or str(error) or type(error).__name__
    return str(text).strip().splitlines()[0].rstrip(".")
