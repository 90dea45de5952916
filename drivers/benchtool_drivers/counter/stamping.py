"""Time stamps of edges: which belong together, and where edges are missing.

A counter that stamps blindly skips edges while it is busy. What it then shows as one interval is
longer by whole periods, by which it is found: an odd number of missing edges makes whole periods of
it, an even number the interval that was due and whole periods more.
"""

from __future__ import annotations

from itertools import pairwise

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, FloatArray

_NEAR = 0.05
"""Share of a period within which a long interval counts as whole periods: jitter of a timer is far
below, and a real long interval seldom there."""

_LEAST_NEAR = 1e-3  # however little the periods scatter in a short record

_LEAST = 5  # stamps from which there is a usual period to hold intervals against


@frozen_record
class Piece:
    """Stamps ``start`` to ``stop`` (exclusive) between which no edge is missing."""

    start: int
    stop: int


@frozen_record(eq=False)
class Stretch:
    """Stamps in their pieces.

    Attributes:
        times_s: Seconds after the first stamp.
        rising: Whether each edge rises.
        pieces: The pieces, in order.
        n_missed: Edges that are missing between them.
        n_left_out: Stamps at the end that had to be left out, since nothing tells which way their
            edges go.
    """

    times_s: FloatArray
    rising: BoolArray
    pieces: tuple[Piece, ...]
    n_missed: int
    n_left_out: int = 0


def one_way(times_s: FloatArray, *, rising: bool) -> Stretch:
    """Return stamps of edges of one direction.

    Args:
        times_s: Increasing stamps in seconds, shape (n,).
        rising: Their direction.
    """
    gaps_s = np.diff(times_s)
    missed = np.zeros(gaps_s.size, int)
    if times_s.size >= _LEAST:
        periods = gaps_s / _middle(gaps_s)
        whole = np.rint(periods)
        skipped = (whole >= 2) & (np.abs(periods - whole) < _NEAR * whole)
        missed[skipped] = whole[skipped].astype(int) - 1
    return Stretch(
        times_s=times_s,
        rising=np.full(times_s.size, rising),
        pieces=_pieces(missed > 0),
        n_missed=int(missed.sum()),
    )


def both_ways(times_s: FloatArray, *, first_rising: bool) -> Stretch:
    """Return stamps of edges of both directions in turn.

    Args:
        times_s: Increasing stamps in seconds, shape (n,).
        first_rising: Direction of the first one.
    """
    n = times_s.size
    missed, stop = _missed_in_turn(times_s)
    number = np.arange(stop) + np.concatenate(([0], np.cumsum(missed)))[:stop]
    return Stretch(
        times_s=times_s[:stop],
        rising=(number % 2 == 0) == first_rising,
        pieces=_pieces(missed[: stop - 1] > 0),
        n_missed=int(missed[: stop - 1].sum()),
        n_left_out=n - stop,
    )


def with_levels(times_s: FloatArray, rising: BoolArray) -> Stretch:
    """Return stamps that came with the level after each edge.

    Args:
        times_s: Increasing stamps in seconds, shape (n,).
        rising: Whether the level after each is high, shape (n,).
    """
    gaps_s = np.diff(times_s)
    alike = rising[1:] == rising[:-1]
    missed = alike.astype(int)
    usual = {state: gaps_s[(rising[:-1] == state) & ~alike] for state in (True, False)}
    if times_s.size >= _LEAST and usual[True].size and usual[False].size:
        period_s = sum(_middle(item) for item in usual.values())
        own_s = np.where(rising[:-1], _middle(usual[True]), _middle(usual[False]))
        more = (gaps_s - np.where(alike, period_s, own_s)) / period_s
        whole = np.rint(more)
        skipped = (whole >= 1) & (np.abs(more - whole) < _NEAR)
        missed = missed + np.where(skipped, 2 * whole, 0).astype(int)
    return Stretch(
        times_s=times_s, rising=rising, pieces=_pieces(missed > 0), n_missed=int(missed.sum())
    )


def _missed_in_turn(times_s: FloatArray) -> tuple[np.ndarray, int]:
    """Return the edges missing after each stamp, and how many stamps can be told the way of."""
    gaps_s = np.diff(times_s)
    missed = np.zeros(gaps_s.size, int)
    if times_s.size < _LEAST:
        return missed, times_s.size
    period_s = _middle(times_s[2:] - times_s[:-2])
    short_s = _middle(np.minimum(gaps_s[1:], gaps_s[:-1]))
    long = gaps_s > period_s - short_s / 2
    near = _tolerance((times_s[2:] - times_s[:-2])[~(long[1:] | long[:-1])] / period_s)
    for k in np.flatnonzero(long):
        before = k > 0 and not long[k - 1]
        due_s = [period_s - gaps_s[k - 1]] if before else [short_s, period_s - short_s]
        odd = _whole(gaps_s[k] / period_s, near)
        even = max(_whole((gaps_s[k] - item) / period_s, near) for item in due_s)
        if odd and (even or k == 0):  # a first pulse can be as long as a period
            return missed, int(k) + 1
        missed[k] = 2 * odd - 1 if odd else 2 * even
    return missed, times_s.size


def _tolerance(periods: FloatArray) -> float:
    """Return how near to whole periods an interval must be, as a share of one.

    Args:
        periods: Periods between which nothing is missing, over the usual one.
    """
    if not periods.size:
        return _NEAR
    return min(_NEAR, 2 * float(np.abs(periods - 1).max()) + _LEAST_NEAR)


def _whole(periods: float, near: float) -> int:
    """Return the whole number of periods that an interval is near, 0 where it is near none."""
    whole = round(periods)
    return whole if whole >= 1 and abs(periods - whole) < near else 0


def _middle(values: FloatArray) -> float:
    """Return the median, the lower of two."""
    return float(np.sort(values)[(values.size - 1) // 2])


def _pieces(breaks: BoolArray) -> tuple[Piece, ...]:
    """Return the pieces between the gaps; ``breaks`` has one less than there are stamps."""
    bounds = [0, *(np.flatnonzero(breaks) + 1).tolist(), breaks.size + 1]
    return tuple(Piece(start=first, stop=stop) for first, stop in pairwise(bounds))
