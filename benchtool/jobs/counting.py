"""Readings of a counter, run after run."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from typing import TypeGuard

from benchtool.errors import UsageError
from benchtool.instruments import Armed, Counter, Instrument, Order, Progress
from benchtool.jobs.acquiring import Enough, named
from benchtool.model.capture import Capture
from benchtool.model.counted import Counted
from benchtool.model.kit import KitInstrument


def gives_readings(instrument: Instrument) -> TypeGuard[Counter]:
    """Say whether an instrument delivers a counter's readings in place of captures."""
    return isinstance(instrument, Counter) and instrument.delivers == "readings"


def count(
    counter: Counter,
    order: Order,
    enough: Enough,
    *,
    progress: Progress | None = None,
    armed: Armed | None = None,
) -> Iterator[tuple[Counted, int]]:
    """Yield whole runs, each with its number of single periods, until there are enough.

    Args:
        counter: The counter.
        order: What to count, and how often.
        enough: How many runs.
        progress: Is told readings behind and in all.
        armed: Is told once the counter waits.

    Raises:
        UsageError: If a number of periods or a duration is asked for (``readings-by-number``).
        InstrumentError: As the tree in ``benchtool.errors`` says; what was yielded before stands.
    """
    if enough.periods is not None or enough.duration_s is not None:
        raise UsageError(
            "a counter takes a number of readings, and sees no record in which periods go by",
            hint="Say how many: --readings 100.",
            code="readings-by-number",
        )
    for _ in range(enough.captures):
        counted = counter.count(order, progress=progress, armed=armed)
        yield counted, single_periods(counted)


def refuse_counting(instrument: Instrument, order: Order) -> None:
    """Refuse options of counters where they would be silently left out.

    Raises:
        UsageError: ``no-counter``.
    """
    stamps = isinstance(instrument, Counter)
    if order.functions or (order.readings is not None and not stamps):
        option = "--function" if order.functions else "--readings"
        raise UsageError(
            f"{option} is for a counter that reads functions; {instrument.resource} is spoken to "
            f"as {instrument.dialect}",
            hint=f"Leave out {option}, or name a counter's dialect with --dialect.",
            code="no-counter",
        )


def single_periods(counted: Counted) -> int:
    """Return how many single periods were read; averages over a gate are none."""
    item = counted.readings.get("period")
    return int(item.values.size) if item is not None and item.per == "interval" else 0


def called(found: Capture | Counted, kept: KitInstrument | None) -> Capture | Counted:
    """Return a capture or readings under the user's names of the channels."""
    return with_name(found, kept) if isinstance(found, Counted) else named(found, kept)


def with_name(counted: Counted, kept: KitInstrument | None) -> Counted:
    """Return readings whose input carries the user's name of it."""
    names = {channel: name for name, channel in kept.channels.items()} if kept else {}
    return replace(counted, channel=names.get(counted.channel, counted.channel))
