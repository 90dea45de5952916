"""The order of the edges: a lock to a ripple, skipped pulses, periods of two values."""

from __future__ import annotations

import math

import numpy as np

from benchtool.model.arrays import FloatArray, middle
from benchtool.model.quantity import Contribution, Measured, Notice
from benchtool.model.regularity import Jumps, Lock, Regularity, Skip, SkipKind
from benchtool.model.timing import Edges, Intervals
from benchtool.timing.lines import MAINS_HZ, find_lines
from benchtool.timing.scatter import two_pass_sd
from benchtool.uncertainty import combine

FLOOR_REL = 1e-4
"""Scatter of the periods that a free timer with usual parts has at least: assumed."""

_LEAST_PERIODS = 8
_TO_SD = 1.4826  # sd over the median distance from the median, of a normal law
_U_MAINS_REL = 5e-4  # of the mains frequency while a record is taken: common practice
_MOST_CHANCE = 0.05  # of a free board to look locked
_MEETS = 2.0  # standard uncertainties
_GAP = 1.5  # periods from one edge to the next alike: a pulse is missing
_UNCLEAR = 0.1  # of a period: a shift known no better says nothing
_KEEPS = 3.0  # standard uncertainties within which the phase is kept
_APART = 6.0  # distance of two values over their scatter; a trend has 3.5, a sine 4.3
_FEWEST = 3  # periods at each value


def find_regularity(
    intervals: Intervals,
    edges: Edges,
    *,
    ripple_hz: Measured | None = None,
    floor_rel: float = FLOOR_REL,
    timebase_rel: float = 50e-6,
) -> Regularity:
    """Return what the order of the edges says beside their mean.

    Args:
        intervals: Intervals of the trace.
        edges: The edges they were made of.
        ripple_hz: Frequency of the ripple on the supply, where that was recorded.
        floor_rel: Scatter of the periods that a free board has at least, relative.
        timebase_rel: Half-width of the timebase error, relative.
    """
    found = find_lines(intervals, edges, ripple_hz=ripple_hz, timebase_rel=timebase_rel)
    # edges that lie on the grid beat with it: intervals swing by up to 2/pi of its step
    least_s = 0.0 if edges.resolved else edges.step_s
    lines = tuple(line for line in found if line.amplitude_s > least_s)
    lock = find_lock(
        intervals, edges, ripple_hz=ripple_hz, floor_rel=floor_rel, timebase_rel=timebase_rel
    )
    ambiguous = any(line.others_hz for line in lines)
    text = "the edges come so evenly that other frequencies would explain a line as well"
    return Regularity(
        lines=lines,
        lock=lock,
        skips=find_skips(edges, rising=intervals.active == "high"),
        jumps=find_jumps(intervals, edges),
        warnings=(Notice(code="line-ambiguous", text=text),) if ambiguous else (),
    )


def find_lock(
    intervals: Intervals,
    edges: Edges,
    *,
    ripple_hz: Measured | None = None,
    floor_rel: float = FLOOR_REL,
    timebase_rel: float = 50e-6,
) -> Lock | None:
    """Return the lock of the period to a ripple, None where there is none to be seen.

    A board that is locked has a period of a whole number of ripple periods and less scatter than
    a free one. Both are asked, and that a free board would seldom have such a period.

    Args:
        intervals: Intervals of the trace.
        edges: The edges they were made of.
        ripple_hz: Frequency of the ripple; None tries the mains and twice it.
        floor_rel: Scatter of the periods that a free board has at least, relative.
        timebase_rel: Half-width of the timebase error, relative.
    """
    period_s = intervals.period_s
    if period_s.size < _LEAST_PERIODS:
        return None
    # The record may begin before the lock: its first periods must not hide it.
    mean_s = middle(period_s)
    scatter_s = _TO_SD * middle(np.abs(period_s - mean_s))
    grid_s = 0.0 if edges.resolved else edges.step_s
    own_s = math.sqrt(max(0.0, scatter_s**2 - grid_s**2 / 6))
    if max(own_s, grid_s / 2) > floor_rel * mean_s:
        return None  # it scatters as a free board does, or the grid hides whether it does
    u_mean_s = max(own_s, grid_s) / math.sqrt(period_s.size)
    ripples = [ripple_hz] if ripple_hz else [_mains(f * m) for f in MAINS_HZ for m in (1, 2)]
    tried = [_lock(mean_s, u_mean_s, ripple, timebase_rel) for ripple in ripples]
    locks = [lock for lock in tried if lock.cycles and abs(lock.off.value) < _MEETS * lock.off.u]
    if not locks or sum(lock.chance for lock in tried) > _MOST_CHANCE:
        return None
    best = min(locks, key=lambda lock: abs(lock.off.value) / lock.off.u)
    return Lock(
        ripple_hz=best.ripple_hz,
        cycles=best.cycles,
        off=best.off,
        scatter_rel=own_s / mean_s,
        floor_rel=floor_rel,
        chance=best.chance,
    )


def _mains(frequency_hz: float) -> Measured:
    return Measured(value=frequency_hz, u=_U_MAINS_REL * frequency_hz, unit="Hz")


def _lock(mean_s: float, u_mean_s: float, ripple: Measured, timebase_rel: float) -> Lock:
    """Return how a period and a ripple would be locked, whether or not they are."""
    cycles = mean_s * ripple.value
    off = combine(
        cycles - round(cycles),
        "1",
        [
            Contribution(source="scatter", u=u_mean_s * ripple.value),
            Contribution(source="ripple", u=ripple.u * mean_s, dof=ripple.dof),
            Contribution(source="timebase", u=cycles * timebase_rel / math.sqrt(3), common=True),
        ],
    )
    return Lock(
        ripple_hz=ripple.value,
        cycles=round(cycles),
        off=off,
        scatter_rel=0.0,
        floor_rel=0.0,
        chance=min(1.0, 2 * _MEETS * off.u),
    )


def find_skips(edges: Edges, *, rising: bool = True) -> tuple[Skip, ...]:
    """Return the gaps in the pulses, and whether the board went on counting in them.

    After an edge that was missed the later ones keep the phase of the earlier ones; a board that
    stood still begins again wherever it likes.

    Args:
        edges: The edges.
        rising: Which of them begin a period.
    """
    found: list[Skip] = []
    for run in edges.runs:
        rows = slice(run.first, run.stop)
        times_s = edges.times_s[rows][edges.rising[rows] == rising]
        if times_s.size >= _LEAST_PERIODS:
            found += _skips(times_s, edges)
    return tuple(found)


def _skips(times_s: FloatArray, edges: Edges) -> list[Skip]:
    usual_s = middle(np.diff(times_s))
    kept = [0]
    for index in range(1, times_s.size):
        if times_s[index] - times_s[kept[-1]] > 0.5 * usual_s:
            kept.append(index)
    times_s = times_s[kept]
    steps_s = np.diff(times_s)
    gaps = np.flatnonzero(steps_s > _GAP * usual_s)
    whole = steps_s[steps_s <= _GAP * usual_s]
    if not gaps.size or whole.size < _LEAST_PERIODS:
        return []
    period_s, sd_s = float(whole.mean()), two_pass_sd(whole)
    grid_s = 0.0 if edges.resolved else edges.step_s
    found: list[Skip] = []
    for gap in gaps:
        length_s = float(steps_s[gap])
        cycles = length_s / period_s
        # Own scatter adds up from period to period; the error of the mean goes with their number.
        u = math.sqrt(
            sd_s**2 * max(1.0, cycles) + (cycles * sd_s) ** 2 / whole.size + grid_s**2 / 6
        )
        shift = combine(
            cycles - round(cycles),
            "1",
            [Contribution(source="scatter", u=u / period_s, dof=whole.size - 1)],
        )
        found.append(
            Skip(
                at_s=float(times_s[gap]),
                length_s=length_s,
                shift=shift,
                kind=_kind(shift, round(cycles)),
            )
        )
    return found


def _kind(shift: Measured, cycles: int) -> SkipKind:
    if shift.u > _UNCLEAR:
        return "unclear"
    return "missed" if cycles >= 2 and abs(shift.value) <= _KEEPS * shift.u else "paused"


def find_jumps(intervals: Intervals, edges: Edges) -> Jumps | None:
    """Return the two values between which the periods jump, None where they do not.

    A worn contact (the wiper of a trimmer, a cracked joint) has two resistances and nothing
    between; drift and ripple have everything between.

    Args:
        intervals: Intervals of the trace.
        edges: The edges they were made of.

    References:
        The cut that leaves the least scatter on both sides (Otsu 1979).
    """
    period_s = intervals.period_s
    if period_s.size < 2 * _FEWEST + 2:
        return None
    ordered = np.sort(period_s)
    n = ordered.size
    counts = np.arange(1, n)
    sums = np.cumsum(ordered)[:-1]
    means_low, means_high = sums / counts, (ordered.sum() - sums) / (n - counts)
    between = counts * (n - counts) * (means_high - means_low) ** 2
    cut = int(np.argmax(between)) + 1
    low, high = ordered[:cut], ordered[cut:]
    if min(low.size, high.size) < _FEWEST:
        return None
    within = math.sqrt((float(np.var(low)) * low.size + float(np.var(high)) * high.size) / (n - 2))
    grid_s = 0.0 if edges.resolved else edges.step_s
    distance_s = float(high.mean() - low.mean())
    scatter_s = max(within, grid_s / math.sqrt(6), 1e-9 * float(ordered[0]))
    if distance_s < _APART * scatter_s:
        return None
    is_high = period_s > (low[-1] + high[0]) / 2
    return Jumps(
        lower_s=float(low.mean()),
        upper_s=float(high.mean()),
        n_lower=low.size,
        n_upper=high.size,
        n_jumps=int(np.count_nonzero(np.diff(is_high))),
        separation=distance_s / scatter_s,
    )
