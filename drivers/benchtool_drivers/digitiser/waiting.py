"""Waiting for the end of an acquisition."""

from __future__ import annotations

import re
import time
from collections.abc import Callable
from contextlib import suppress

from benchtool.errors import InstrumentError, InstrumentTimeoutError, NoTriggerError
from benchtool.instruments import Armed
from benchtool_drivers.dialect.records import AcquireKeys, Wait
from benchtool_drivers.digitiser.numerals import is_whole
from benchtool_drivers.digitiser.talk import Talk


def wait_for_end(
    talk: Talk,
    *,
    timeout_s: float,
    armed: Armed | None = None,
    force: Callable[[], None] | None = None,
) -> None:
    """Wait until the record is there.

    Args:
        talk: The instrument, armed.
        timeout_s: How long to wait.
        armed: Is told once it waits for its trigger.
        force: Triggers it by command; called once, when it waits.

    Raises:
        NoTriggerError: If the time is over; the acquisition was given up then.
    """
    wait: Wait = talk.dialect.body.acquire.wait
    if wait.by in ("poll", "bits"):
        _poll(talk, wait, timeout_s, armed, force)
        return
    if armed is not None:
        armed()
    if force is not None:
        force()
    if wait.by == "delay":
        time.sleep(min(wait.delay_s, timeout_s))
    if wait.by == "opc" or wait.opc:
        _operation_complete(talk, timeout_s)


def _poll(
    talk: Talk,
    wait: Wait,
    timeout_s: float,
    armed: Armed | None,
    force: Callable[[], None] | None,
) -> None:
    end_s = time.monotonic() + timeout_s
    time.sleep(min(wait.settle_s, timeout_s))
    began = False
    while True:
        status = talk.ask(wait.query, "the state")
        done = _is_done(talk, wait, status)
        if not began and (done or not wait.waiting or re.search(wait.waiting, status)):
            began = True
            if armed is not None:
                armed()
            if force is not None and not done:
                force()
        if done:
            return
        if time.monotonic() >= end_s:
            raise _no_trigger(talk, wait.query, status, timeout_s)
        time.sleep(min(wait.interval_s, max(end_s - time.monotonic(), 0.0)))


def _is_done(talk: Talk, wait: Wait, status: str) -> bool:
    if wait.by == "poll":
        return re.search(wait.done, status) is not None
    value = talk.number(status, "the register", wait.query)
    if not is_whole(value):
        raise talk.wrong(
            f"the register is {status!r}, which is no whole number",
            hint="Compare the query of wait in [acquire] with the manual.",
            command=wait.query,
            expected="a whole number",
            got=status,
        )
    return int(value) & wait.mask == wait.equals


def _operation_complete(talk: Talk, timeout_s: float) -> None:
    try:
        talk.ask("*OPC?", "all is done", timeout_s=timeout_s)
    except InstrumentTimeoutError as error:
        raise _no_trigger(talk, "*OPC?", "no answer", timeout_s) from error


def _no_trigger(talk: Talk, query: str, status: str, timeout_s: float) -> NoTriggerError:
    """Give up the acquisition and return the error; what the instrument says to it is dropped."""
    acquire: AcquireKeys = talk.dialect.body.acquire
    step = talk.step(query, expected="the end of the acquisition", got=status)
    with suppress(InstrumentError):
        talk.send(acquire.abort, "give up waiting")
        talk.errors()
    return NoTriggerError(
        f"no record came within {timeout_s:g} s; the last state was {status!r}",
        hint="Check trigger level, source and cable. --trigger-timeout waits longer, "
        "--force-trigger triggers by command.",
        step=step,
    )
