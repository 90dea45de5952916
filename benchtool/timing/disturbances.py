"""Edges and intervals that are no part of the oscillation: glitches, bounce, outliers."""

from __future__ import annotations

from dataclasses import replace
from enum import IntEnum

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, FloatArray, NDArray, middle
from benchtool.model.timing import Edges

SHORT = 0.15
"""Share of the usual width below which an interval is a glitch or bounce."""

_OUTLYING_SD = 6.0
_OUTLYING_REL = 0.10
_MOST_OUTLYING = 0.25
_FIRST_HIGH = (1.3, 1.9)


class Reason(IntEnum):
    """Why an interval does not count; ``GOOD`` ones do."""

    GOOD = 0
    INTERRUPTED = 1
    MISSING_PULSE = 2
    OUTLIER = 3
    FIRST_HIGH = 4


@frozen_record(eq=False)
class Widths:
    """Times between neighbouring edges of one run.

    Attributes:
        start_s: When each begins, shape (n,).
        width_s: How long each is, shape (n,).
        is_high: Its state, shape (n,).
        run: Number of its run, shape (n,).
        reason: A :class:`Reason` each, shape (n,).
    """

    start_s: FloatArray
    width_s: FloatArray
    is_high: BoolArray
    run: NDArray[np.int64]
    reason: NDArray[np.int64]


@frozen_record(eq=False)
class CleanEdges:
    """Edges without glitches and bounce.

    Attributes:
        times_s, rising, run: Of each edge left, shape (n,).
        interrupted: Whether glitches were taken out before the edge, shape (n,).
        n_glitches, n_bounces: How many were taken out.
    """

    times_s: FloatArray
    rising: BoolArray
    run: NDArray[np.int64]
    interrupted: BoolArray
    n_glitches: int
    n_bounces: int


def clean_edges(edges: Edges) -> CleanEdges:
    """Take out the edges of glitches and all but the first edge of each bounce.

    Short intervals in a row that lie between two long ones of the same state are a glitch: all
    their edges go. Between two long ones of opposite states they are bounce: the first edge
    stays.
    """
    run = np.repeat(np.arange(len(edges.runs)), [r.stop - r.first for r in edges.runs])
    kept, glitch = np.ones(run.size, np.bool_), np.zeros(run.size, np.bool_)
    n_glitches = n_bounces = 0
    for first, stop in _short_groups(edges, run):
        if (stop - first) % 2:
            kept[first : stop + 1] = False
            glitch[first : stop + 1] = True
            n_glitches += 1
        else:
            kept[first + 1 : stop + 1] = False
            n_bounces += 1
    before = np.cumsum(glitch)[kept]
    return CleanEdges(
        times_s=edges.times_s[kept],
        rising=edges.rising[kept],
        run=run[kept],
        interrupted=np.diff(before, prepend=0) > 0,
        n_glitches=n_glitches,
        n_bounces=n_bounces,
    )


def _short_groups(edges: Edges, run: NDArray[np.int64]) -> list[tuple[int, int]]:
    """Return rows of short intervals: from edge ``first`` to edge ``stop``."""
    width_s = np.diff(edges.times_s)
    together = run[1:] == run[:-1]
    short = np.zeros(width_s.size, np.bool_)
    for state in (True, False):
        of_state = together & (edges.rising[:-1] == state)
        if of_state.any():
            short |= of_state & (width_s < SHORT * _usual_width(width_s[of_state]))
    # A row must not reach across two runs: their joint is never short.
    ends = np.flatnonzero(np.diff(np.concatenate([[False], short, [False]]).astype(np.int8)))
    return [(int(a), int(b)) for a, b in ends.reshape(-1, 2)]


def _usual_width(width_s: FloatArray) -> float:
    """Return the median width, or that of the long ones where bounce outnumbers them."""
    median = middle(width_s)
    ordered = np.sort(width_s)
    total = np.cumsum(ordered)
    heavy = float(ordered[int(np.searchsorted(total, total[-1] / 2))])
    if median >= SHORT * heavy:
        return median
    n_heavy = int(np.count_nonzero(width_s > SHORT * heavy))
    return heavy if n_heavy >= max(2, 0.12 * width_s.size) else median


def widths_between(clean: CleanEdges) -> Widths:
    """Return the intervals between the edges of each run."""
    inside = clean.run[1:] == clean.run[:-1]
    start_s = clean.times_s[:-1][inside]
    return Widths(
        start_s=start_s,
        width_s=clean.times_s[1:][inside] - start_s,
        is_high=clean.rising[:-1][inside],
        run=clean.run[:-1][inside],
        reason=np.where(clean.interrupted[1:][inside], Reason.INTERRUPTED, Reason.GOOD),
    )


def mark_first_high(widths: Widths, edges: Edges, powered_s: float | None = None) -> Widths:
    """Set apart the long first high of a record that begins before the supply comes up.

    From an empty capacitor the first high lasts ln 3/ln 2 = 1.585 times the others.

    Args:
        widths: Times between neighbouring edges.
        edges: The edges they were made of.
        powered_s: When the supply was seen to come up, seconds: the high that begins with it is
            the first one, whether or not there are others to compare.
    """
    if powered_s is not None:
        return _marked(widths, _begun_with(widths, powered_s, edges.step_s), Reason.FIRST_HIGH)
    starts_low = bool(edges.runs) and not edges.runs[0].starts_high
    if not (starts_low and widths.width_s.size and widths.is_high[0] and widths.run[0] == 0):
        return widths
    others = widths.width_s[1:][widths.is_high[1:] & (widths.reason[1:] == Reason.GOOD)]
    if not others.size or widths.reason[0] != Reason.GOOD:
        return widths
    ratio = widths.width_s[0] / middle(others)
    if not _FIRST_HIGH[0] <= ratio <= _FIRST_HIGH[1] or widths.width_s[0] <= others.max():
        return widths
    if widths.width_s[0] - middle(others) < 2 * edges.step_s:
        return widths
    return _marked(widths, np.array([0]), Reason.FIRST_HIGH)


def _begun_with(widths: Widths, powered_s: float, step_s: float) -> NDArray[np.intp]:
    """Return the index of the high that begins with the supply, none where there is none."""
    if not widths.width_s.size or not widths.is_high[0]:
        return np.empty(0, np.intp)
    late_s = widths.start_s[0] - powered_s
    with_supply = abs(late_s) <= max(3 * step_s, 0.02 * widths.width_s[0])
    return np.array([0] if with_supply else [], np.intp)


def mark_outliers(widths: Widths, step_s: float) -> tuple[Widths, int]:
    """Mark intervals far from the median of their state, and those with a missing pulse.

    Args:
        widths: The intervals.
        step_s: Grid of the times in seconds: two steps are never far.

    Returns:
        The marked intervals, and how many lie far but are too many to be exceptions.
    """
    good = widths.reason == Reason.GOOD
    states = [np.flatnonzero(good & (widths.is_high == state)) for state in (True, False)]
    medians = [middle(widths.width_s[s]) if s.size else 0.0 for s in states]
    n_scattered = 0
    for chosen, median in zip(states, medians, strict=True):
        far = chosen[_is_far(widths.width_s[chosen], median, step_s)]
        missing = far[_misses_pulse(widths.width_s[far], median, sum(medians))]
        if far.size > _MOST_OUTLYING * chosen.size:
            n_scattered += far.size
            continue
        widths = _marked(widths, far, Reason.OUTLIER)
        widths = _marked(widths, missing, Reason.MISSING_PULSE)
    return widths, n_scattered


def _is_far(width_s: FloatArray, median_s: float, step_s: float) -> BoolArray:
    if width_s.size < 3:
        return np.zeros(width_s.size, np.bool_)
    away = np.abs(width_s - median_s)
    sd = 1.4826 * middle(away)
    return away > max(_OUTLYING_SD * sd, _OUTLYING_REL * median_s, 2 * step_s)


def _misses_pulse(width_s: FloatArray, median_s: float, period_s: float) -> BoolArray:
    """Tell intervals that are longer by a whole number of periods."""
    if period_s == 0:
        return np.zeros(width_s.size, np.bool_)
    cycles = (width_s - median_s) / period_s
    return (cycles > 0.5) & (np.abs(cycles - np.round(cycles)) < 0.15)


def _marked(widths: Widths, where: NDArray[np.int64], reason: Reason) -> Widths:
    marks = widths.reason.copy()
    marks[where] = reason
    return replace(widths, reason=marks)
