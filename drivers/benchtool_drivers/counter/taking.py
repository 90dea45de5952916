"""Taking N readings: as one array, as a count that is started, or one by one."""

from __future__ import annotations

from contextlib import suppress

import numpy as np

from benchtool.errors import InstrumentError, InstrumentTimeoutError, NoTriggerError
from benchtool.frozen import frozen_record
from benchtool.instruments import Armed, Order, Progress
from benchtool.model.arrays import AnyArray
from benchtool_drivers.dialect.counting import CounterKeys, ReadingKeys
from benchtool_drivers.digitiser.decoding import Layout, decode, looks_exchanged
from benchtool_drivers.digitiser.talk import Talk
from benchtool_drivers.digitiser.waiting import wait_for_end

_LONGEST_HEADER = 128


@frozen_record
class Batch:
    """Readings to take.

    Attributes:
        channel: The input.
        function: The instrument's word for what is counted; empty for stamps.
        n: How many.
        per_reading: Numbers that one reading has: 2 where a level goes with each.
    """

    channel: str
    n: int
    function: str = ""
    per_reading: int = 1


def take(
    talk: Talk, batch: Batch, order: Order, progress: Progress | None, armed: Armed | None
) -> AnyArray:
    """Return all numbers of a batch as they came.

    Args:
        talk: The counter, set up.
        batch: What to take.
        order: Whether to start and to force, and how long to wait.
        progress: Is told readings behind and in all.
        armed: Is told once the counter waits.

    Raises:
        NoTriggerError: If readings do not come in time.
        InstrumentError: If not all of them came, or something is no number.
    """
    body: CounterKeys = talk.dialect.body
    most = batch.n if body.take.by == "loop" else body.take.most
    parts: list[AnyArray] = []
    for first in range(0, batch.n, most):
        n = min(most, batch.n - first)
        _configure(talk, batch, n)
        if body.take.by == "loop":
            parts.append(_one_by_one(talk, batch, order, progress))
        else:
            if order.arm:
                _start(talk, order, armed if first == 0 else None)
            parts.append(_together(talk, batch, n))
        if progress is not None:
            progress(first + n, batch.n)
    return np.concatenate(parts)


def _configure(talk: Talk, batch: Batch, n: int) -> None:
    body: CounterKeys = talk.dialect.body
    values = {"channel": batch.channel, "function": batch.function, "n": n}
    talk.send(talk.dialect.channel.select, "choose the input", channel=batch.channel)
    talk.send(body.take.configure, "what to count, and how often", **values)
    if talk.dialect.channel.select or body.take.configure:
        talk.refuse_errors("choosing what to count")


def _start(talk: Talk, order: Order, armed: Armed | None) -> None:
    body: CounterKeys = talk.dialect.body
    if not body.acquire.arm:
        return
    talk.send(body.acquire.arm, "start counting")
    wait_for_end(
        talk,
        timeout_s=order.trigger_timeout_s or body.acquire.timeout_s,
        armed=armed,
        force=(lambda: talk.send(body.acquire.force, "trigger it")) if order.force else None,
    )
    talk.refuse_errors("starting to count")


def _together(talk: Talk, batch: Batch, n: int) -> AnyArray:
    """Return numbers that come in one answer."""
    data: ReadingKeys = talk.dialect.body.data
    query = _query(talk, batch, n)
    n_values = n * batch.per_reading
    layout = Layout(dtype="ascii" if data.is_text else data.dtype, order=data.order, skip=0)
    with talk.told_if_failing(query, "readings"):
        if data.is_text:
            content = _plain(talk, talk.link.ask_text_list(query), query)
        else:
            n_bytes = n_values * layout.numpy_dtype.itemsize
            content = talk.link.ask_block(query, n_bytes=n_bytes, trailer=data.trailer)
    talk.tell("block", query, f"{len(content)} bytes", "readings")
    values = decode(talk, content, layout, n_values)
    if looks_exchanged(values):
        raise talk.wrong(
            "the readings are beyond all measure, and sound with their bytes in the other order",
            hint="Compare order in [data] with the manual.",
            command=query,
            expected=f"numbers of {data.order} byte order",
            got=", ".join(map(str, values[:4])),
            code="byte-order",
        )
    return values


def _one_by_one(talk: Talk, batch: Batch, order: Order, progress: Progress | None) -> AnyArray:
    """Return numbers that are asked for one at a time."""
    body: CounterKeys = talk.dialect.body
    query = _query(talk, batch, 1)
    timeout_s = order.trigger_timeout_s or body.acquire.timeout_s
    values = []
    for k in range(batch.n):
        try:
            answer = talk.ask(query, "a reading", timeout_s=timeout_s)
        except InstrumentTimeoutError as error:
            raise _no_reading(talk, query, k + 1, timeout_s) from error
        values.append(talk.number(answer, f"reading {k + 1}", query))
        if progress is not None:
            progress(k + 1, batch.n)
    return np.array(values)


def _no_reading(talk: Talk, query: str, number: int, timeout_s: float) -> NoTriggerError:
    """Give up counting and return the error."""
    step = talk.step(query, expected="a reading", got="no answer")
    with suppress(InstrumentError):
        talk.send(talk.dialect.body.acquire.abort, "give up waiting")
        talk.errors()
    return NoTriggerError(
        f"reading {number} did not come within {timeout_s:g} s",
        hint="Check trigger level, input and cable; a slow timer needs a longer --trigger-timeout.",
        step=step,
    )


def _query(talk: Talk, batch: Batch, n: int) -> str:
    data: ReadingKeys = talk.dialect.body.data
    return data.query.format(channel=batch.channel, function=batch.function, n=n)


def _plain(talk: Talk, content: bytes, query: str) -> bytes:
    """Take the header off a long text."""
    head = content[:_LONGEST_HEADER].decode("latin-1")
    return content[len(head) - len(talk.dialect.link.plain(head, query)) :]
