"""Time stamps as they come, made a capture, or periods where all edges go one way."""

from __future__ import annotations

import hashlib
import re
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from benchtool.errors import UsageError
from benchtool.frozen import frozen_record
from benchtool.instruments import Armed, Order, Progress
from benchtool.model.arrays import AnyArray, FloatArray
from benchtool.model.capture import Capture, LogicTrace, Origin, StructurePoint, TimeSpan
from benchtool.model.counted import Readings
from benchtool.model.quantity import Notice
from benchtool_drivers.counter.masking import is_missing, masked
from benchtool_drivers.counter.stamping import Stretch, both_ways, one_way, with_levels
from benchtool_drivers.counter.taking import Batch, take
from benchtool_drivers.dialect.counters import TIMES
from benchtool_drivers.dialect.counting import CounterKeys, FirstEdge, StampKeys
from benchtool_drivers.digitiser.talk import Talk


@frozen_record(eq=False)
class Stamped:
    """Time stamps of one run.

    Attributes:
        channel: The input.
        stretch: The edges in their pieces.
        tick_s: Resolution of the stamps in seconds.
        n_missing: Stamps that were marked as none.
        raw: All numbers as they came.
        notices: What was noticed.
    """

    channel: str
    stretch: Stretch
    tick_s: float
    n_missing: int
    raw: bytes
    notices: tuple[Notice, ...]


def read_stamps(
    talk: Talk,
    channel: str,
    order: Order,
    resolution_s: float,
    progress: Progress | None,
    armed: Armed | None,
) -> Stamped:
    """Return the stamps of one run.

    Args:
        talk: The counter, set up.
        channel: The input.
        order: How many, and how long to wait.
        resolution_s: Resolution, and the length of a tick.
        progress: Is told stamps behind and in all.
        armed: Is told once the counter waits.

    Raises:
        InstrumentError: If not all of them came, all are marked as none, or they do not increase.
    """
    body: CounterKeys = talk.dialect.body
    keys = body.stamps
    if keys is None:
        raise ValueError(f"the dialect {talk.dialect.name} has no stamps")
    n = order.readings or body.take.n
    if n > body.take.most:
        raise UsageError(
            f"the counter holds {body.take.most} time stamps at most, and {n} are asked for",
            hint=f"Give --readings {body.take.most}, or less.",
            code="too-many-stamps",
        )
    per_reading = 2 if keys.edges == "levels" else 1
    raw = take(talk, Batch(channel=channel, n=n, per_reading=per_reading), order, progress, armed)
    levels = raw[1::2] if keys.edges == "levels" else None
    stamps = raw[::2] if keys.edges == "levels" else raw
    kept = ~is_missing(talk, stamps)
    _, n_missing, notices = masked(talk, stamps, "time stamps", body.data.query)
    times_s = _seconds(talk, stamps[kept], keys, resolution_s)
    high = None if levels is None else _levels(talk, levels[kept])
    n_before = int(np.argmax(kept))  # edges whose stamps are marked as none, before the first
    stretch = _stretch(talk, times_s, high, channel, in_turn=n_before % 2 == 0)
    return Stamped(
        channel=channel,
        stretch=stretch,
        tick_s=resolution_s,
        n_missing=n_missing,
        raw=raw.tobytes(),
        notices=(*notices, *_missed(stretch)),
    )


def _seconds(talk: Talk, stamps: AnyArray, keys: StampKeys, tick_s: float) -> FloatArray:
    """Return seconds after the first stamp; whole ticks are subtracted before they are scaled."""
    whole = stamps.dtype.kind in "iu"
    counts = stamps.astype(np.int64) if whole else stamps.astype(np.float64)
    factor = tick_s if keys.unit == "ticks" else TIMES[keys.unit]
    times_s: FloatArray = (counts - counts[0]) * factor
    steps_s = np.diff(times_s)
    if steps_s.size and steps_s.min() <= 0:
        first = int(np.argmax(steps_s <= 0)) + 1
        raise talk.wrong(
            f"time stamp {first + 1} does not lie after the one before it",
            hint="The counter of ticks has wrapped, or byte order or type in [data] is another: "
            "compare with the manual.",
            command=talk.dialect.body.data.query,
            expected="stamps that increase",
            got=", ".join(map(str, stamps[first - 1 : first + 2].tolist())),
            code="stamps-not-increasing",
        )
    return times_s


def _levels(talk: Talk, levels: AnyArray) -> np.ndarray:
    if not np.isin(levels, (0, 1)).all():
        raise talk.wrong(
            "a level beside a time stamp is neither 0 nor 1",
            hint="Compare edges in [stamps] with the manual: is there a level with each stamp?",
            command=talk.dialect.body.data.query,
            expected="0 or 1",
            got=", ".join(map(str, levels[:4].tolist())),
            code="impossible-reading",
        )
    found: np.ndarray = levels == 1
    return found


def _stretch(
    talk: Talk, times_s: FloatArray, high: np.ndarray | None, channel: str, *, in_turn: bool
) -> Stretch:
    """Return the stamps in their pieces; ``in_turn``: the first held goes as the first edge did."""
    keys: StampKeys = talk.dialect.body.stamps
    if high is not None:
        return with_levels(times_s, high)
    if keys.edges in ("rising", "falling"):
        return one_way(times_s, rising=keys.edges == "rising")
    first = keys.first
    if isinstance(first, FirstEdge):
        answer = talk.ask(first.query, "which way the first edge goes", channel=channel)
        rising = re.search(first.rising, answer) is not None
    else:
        rising = first == "rising"
    return both_ways(times_s, first_rising=rising == in_turn)


def _missed(stretch: Stretch) -> tuple[Notice, ...]:
    notices = []
    n_gaps = len(stretch.pieces) - 1
    if n_gaps:
        places = "one place" if n_gaps == 1 else f"{n_gaps} places"
        text = (
            f"the counter skipped {stretch.n_missed} edges at {places}: the time between its "
            "stamps there is whole periods longer, and is taken as a gap"
        )
        notices.append(Notice(code="edges-skipped", text=text))
    if stretch.n_left_out:
        text = (
            f"the last {stretch.n_left_out} time stamps are left out: after a skip nothing tells "
            "which of their edges rise"
        )
        notices.append(Notice(code="stamps-left-out", text=text))
    return tuple(notices)


def periods_of(stamped: Stamped, talk: Talk) -> Readings:
    """Return the periods between stamps of one direction, which follow each other.

    Raises:
        ReplyError: ``no-valid-readings``: if there are no two stamps between which none is missing.
    """
    times_s, periods, chains, n = stamped.stretch.times_s, [], [], 0
    for piece in stamped.stretch.pieces:
        own = np.diff(times_s[piece.start : piece.stop])
        periods.append(own)
        if own.size:
            chains.append((n, n + own.size))
        n += own.size
    if not n:
        raise talk.wrong(
            "no two time stamps follow each other",
            hint="Ask for more: --readings.",
            command=talk.dialect.body.data.query,
            expected="time stamps",
            got=f"{times_s.size}",
            code="no-valid-readings",
        )
    return Readings(
        values=np.concatenate(periods), n_missing=stamped.n_missing, chains=tuple(chains)
    )


def capture_of(
    stamped: Stamped,
    origin: Origin,
    structure: Sequence[StructurePoint],
    notices: tuple[Notice, ...],
) -> Capture:
    """Return edges of both directions as a capture of one logic trace.

    Args:
        stamped: The stamps.
        origin: Where they came from; the hash of the stamps is filled in.
        structure: What was read and stated besides.
        notices: What was noticed before.
    """
    stretch = stamped.stretch
    spans = tuple(
        TimeSpan(
            start_s=float(stretch.times_s[piece.start]),
            end_s=float(stretch.times_s[piece.stop - 1]),
            starts_high=not stretch.rising[piece.start],
        )
        for piece in stretch.pieces
    )
    trace = LogicTrace(
        times_s=stretch.times_s,
        states=stretch.rising,
        spans=spans,
        tick_s=stamped.tick_s,
        channel=stamped.channel,
        end_known=False,
    )
    points = [
        ("kind", "transitions", "time stamps of both edges"),
        ("tick", f"{stamped.tick_s:.9g} s", "resolution of the counter"),
        ("edges", str(stretch.times_s.size), "time stamps read"),
    ]
    own = [
        StructurePoint(name=name, value=value, evidence=evidence, sure="stated")
        for name, value, evidence in points
    ]
    return Capture(
        origin=replace(origin, sha256=hashlib.sha256(stamped.raw).hexdigest()),
        traces=(trace,),
        structure=(*own, *structure),
        warnings=(*notices, *stamped.notices),
    )
