"""Captures from a live source, whole ones only, until there are enough."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from typing import Any

from benchtool.errors import BenchtoolError, UsageError
from benchtool.frozen import frozen_record
from benchtool.instruments import Armed, Instrument, Order, Progress, Recorder
from benchtool.model.capture import Capture, ReadOptions
from benchtool.model.kit import KitInstrument
from benchtool.model.options import MeasureOptions
from benchtool.pipeline import measure

MOST_CAPTURES = 10_000
"""Captures after which ``until`` gives up: a dead board would be recorded for ever."""


@frozen_record
class Enough:
    """When to stop.

    Attributes:
        captures: So many captures.
        periods: So many complete periods over all captures; None where not asked for.
        duration_s: So long a record, of a stream; None where not asked for.
    """

    captures: int = 1
    periods: int | None = None
    duration_s: float | None = None


def acquire(
    instrument: Instrument,
    order: Order,
    enough: Enough,
    *,
    progress: Progress | None = None,
    armed: Armed | None = None,
) -> Iterator[tuple[Capture, int]]:
    """Yield whole captures, each with its number of complete periods, until there are enough.

    Args:
        instrument: The instrument.
        order: What to acquire.
        enough: When to stop.
        progress: Is told how far a transfer has come.
        armed: Is told once the instrument waits for its trigger.

    Raises:
        InstrumentError: As the tree in ``benchtool.errors`` says; what was yielded before stands.
        UsageError: If a duration is asked of an instrument, whose own settings decide it
            (``duration-of-record``).
    """
    if enough.duration_s is not None:
        raise UsageError(
            "the length of a record is the instrument's own setting",
            hint='Set it there, or stop after a count: --until "50 periods".',
            code="duration-of-record",
        )
    n_periods = 0
    for k in range(MOST_CAPTURES if enough.periods else enough.captures):
        capture = instrument.acquire(order, progress=progress, armed=armed)
        found = count_periods(capture)
        n_periods += found
        yield capture, found
        if enough.periods and n_periods >= enough.periods and k + 1 >= enough.captures:
            return


def record(stream: Recorder, enough: Enough, *, progress: Progress | None = None) -> Capture:
    """Return one capture of a stream, from now until there is enough of it.

    Raises:
        InstrumentError: If the stream ends before.
    """
    return stream.record(
        until_periods=enough.periods, duration_s=enough.duration_s, progress=progress
    )


def count_periods(capture: Capture) -> int:
    """Return the complete periods of a capture, of its first trace where several could be meant.

    Where nothing can be measured there are none.
    """
    for channel in (None, capture.traces[0].channel):
        try:
            found = measure(capture, options=MeasureOptions(read=ReadOptions(channel=channel)))
        except BenchtoolError:
            continue
        intervals = found.results[0].intervals
        return intervals.period if intervals else 0
    return 0


def named(capture: Capture, kept: KitInstrument | None) -> Capture:
    """Return a capture whose traces carry the user's names of the channels."""
    if kept is None or not kept.channels:
        return capture
    names = {channel: name for name, channel in kept.channels.items()}
    renamed: list[Any] = [
        replace(trace, channel=names.get(trace.channel, trace.channel)) for trace in capture.traces
    ]
    return replace(capture, traces=tuple(renamed))
