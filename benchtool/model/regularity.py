"""What the order of the edges says beside their mean: lines, locks, skips, jumps."""

from __future__ import annotations

from typing import Literal

from benchtool.frozen import frozen_record
from benchtool.model.quantity import Measured, Notice

LineSource = Literal["mains", "supply", "unknown"]
SkipKind = Literal["missed", "paused", "unclear"]


@frozen_record
class Line:
    """A frequency that the intervals follow.

    Attributes:
        frequency: Of it, hertz; above the mean rate of the edges as well as below.
        amplitude_s: Of the intervals that follow it, seconds.
        false_alarm: Chance of such a line anywhere in what was searched, where there is none.
        source: ``mains`` where it lies at a multiple of 50 or 60 Hz, ``supply`` where the supply
            was seen to have it, else ``unknown``.
        of_hz: Frequency of the mains or of the supply's ripple that it belongs to.
        others_hz: The lowest frequencies that the edges, being too even, cannot tell from it.
        n_others: How many of those there are.
    """

    frequency: Measured
    amplitude_s: float
    false_alarm: float
    source: LineSource
    of_hz: float | None = None
    others_hz: tuple[float, ...] = ()
    n_others: int = 0


@frozen_record
class Lock:
    """A period that sits on a multiple of a ripple's.

    Attributes:
        ripple_hz: Frequency of the ripple.
        cycles: Ripple periods in one period of the board.
        off: By how much the period misses that whole number, with its uncertainty, in ripple
            periods.
        scatter_rel: Scatter of the periods, relative.
        floor_rel: Scatter that a free board has at least, relative.
        chance: Share of free boards whose period would lie so near.
    """

    ripple_hz: float
    cycles: int
    off: Measured
    scatter_rel: float
    floor_rel: float
    chance: float


@frozen_record
class Skip:
    """A gap in the pulses.

    Attributes:
        at_s: When the last edge before it came, seconds.
        length_s: To the next edge.
        shift: Phase of the later edges against the earlier ones, in periods.
        kind: ``missed`` where they keep the phase, ``paused`` where they do not, else ``unclear``.
    """

    at_s: float
    length_s: float
    shift: Measured
    kind: SkipKind


@frozen_record
class Jumps:
    """Periods that have two values.

    Attributes:
        lower_s, upper_s: The two.
        n_lower, n_upper: Periods at each.
        n_jumps: Changes from one to the other.
        separation: Their distance over the scatter at each.
    """

    lower_s: float
    upper_s: float
    n_lower: int
    n_upper: int
    n_jumps: int
    separation: float


@frozen_record
class Regularity:
    """All of it; empty or None where nothing of a kind was seen."""

    lines: tuple[Line, ...] = ()
    lock: Lock | None = None
    skips: tuple[Skip, ...] = ()
    jumps: Jumps | None = None
    warnings: tuple[Notice, ...] = ()
