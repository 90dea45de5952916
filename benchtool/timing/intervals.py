"""Intervals between edges: the complete ones, the cut ones, and those that do not count."""

from __future__ import annotations

from itertools import pairwise
from typing import Literal

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, NDArray
from benchtool.model.quantity import Notice
from benchtool.model.timing import CutInterval, Dropped, Edges, Intervals
from benchtool.timing.disturbances import (
    CleanEdges,
    Reason,
    Widths,
    clean_edges,
    mark_first_high,
    mark_outliers,
    widths_between,
)

State = Literal["high", "low"]

_REASONS = {
    Reason.INTERRUPTED: "interrupted interval",
    Reason.MISSING_PULSE: "missing pulse",
    Reason.OUTLIER: "outlier",
    Reason.FIRST_HIGH: "first high after power-up",
}


def find_intervals(
    edges: Edges, *, active: State = "high", powered_s: float | None = None
) -> Intervals:
    """Sort the time between edges into complete, cut and disturbed intervals.

    Args:
        edges: The edges; no interval reaches across two of their runs.
        active: State that begins a cycle: a period runs from its first edge to the next alike.
        powered_s: When the supply was seen to come up, seconds, where it was.

    Returns:
        Complete intervals in seconds; what was left out is counted with its reason.
    """
    clean = clean_edges(edges)
    found = mark_first_high(widths_between(clean), edges, powered_s)
    widths, n_scattered = mark_outliers(found, edges.step_s)
    cycles = _cycles(widths, starts_high=active == "high")
    others = _cycles(widths, starts_high=active != "high")
    cut = _cut_intervals(edges, clean)
    good = widths.reason == Reason.GOOD
    high, low = good & widths.is_high, good & ~widths.is_high
    first_high = widths.width_s[widths.reason == Reason.FIRST_HIGH]
    return Intervals(
        high_s=widths.width_s[high],
        low_s=widths.width_s[low],
        period_s=cycles.high_s + cycles.low_s,
        high_starts_s=widths.start_s[high],
        low_starts_s=widths.start_s[low],
        period_starts_s=cycles.start_s,
        cycle_high_s=cycles.high_s,
        cycle_low_s=cycles.low_s,
        chains=cycles.chains,
        active=active,
        other_period_s=others.high_s + others.low_s,
        first_high_s=float(first_high[0]) if first_high.size else None,
        cut=cut,
        dropped=_dropped(clean, widths, cut, len(edges.runs), edges.n_runts),
        warnings=_notices(clean, widths, n_scattered, len(edges.runs)),
    )


@frozen_record(eq=False)
class _Cycles:
    """Whole cycles: where each begins, its two parts, and how far they follow one another."""

    start_s: FloatArray
    high_s: FloatArray
    low_s: FloatArray
    chains: tuple[tuple[int, int], ...]


def _cycles(widths: Widths, *, starts_high: bool) -> _Cycles:
    """Pair each interval that begins a cycle with the one after it, where both are good."""
    good = widths.reason == Reason.GOOD
    pairs = good[:-1] & good[1:] & (widths.run[:-1] == widths.run[1:])
    at = np.flatnonzero(pairs & (widths.is_high[:-1] == starts_high))
    first, second = widths.width_s[at], widths.width_s[at + 1]
    return _Cycles(
        start_s=widths.start_s[at],
        high_s=first if starts_high else second,
        low_s=second if starts_high else first,
        chains=_chains(at, widths.run),
    )


def _chains(at: NDArray[np.int64], run: NDArray[np.int64]) -> tuple[tuple[int, int], ...]:
    """Return index ranges of cycles that follow each other without a break."""
    if not at.size:
        return ()
    breaks = np.flatnonzero((np.diff(at) != 2) | (np.diff(run[at]) != 0)) + 1
    limits = [0, *(int(x) for x in breaks), at.size]
    return tuple(pairwise(limits))


def _cut_intervals(edges: Edges, clean: CleanEdges) -> tuple[CutInterval, ...]:
    """Return what the ends of each run cut: known to last at least so long."""
    cut: list[CutInterval] = []
    for number, run in enumerate(edges.runs):
        start, stop = np.searchsorted(clean.run, [number, number + 1])
        if start == stop:
            cut.append(_cut(run.starts_high, run.end_s - run.start_s, "both"))
            continue
        cut.append(_cut(run.starts_high, clean.times_s[start] - run.start_s, "start"))
        cut.append(_cut(bool(clean.rising[stop - 1]), run.end_s - clean.times_s[stop - 1], "end"))
    return tuple(cut)


def _cut(is_high: bool, length_s: float, where: Literal["start", "end", "both"]) -> CutInterval:
    return CutInterval(
        kind="high" if is_high else "low", at_least_s=max(0.0, float(length_s)), where=where
    )


def _dropped(
    clean: CleanEdges, widths: Widths, cut: tuple[CutInterval, ...], n_runs: int, n_runts: int
) -> tuple[Dropped, ...]:
    counts = {
        "cut at start": sum(c.where != "end" for c in cut[:1]),
        "cut at end": sum(c.where != "start" for c in cut[-1:]),
        "cut by a gap": max(0, 2 * (n_runs - 1)),
        "glitch": clean.n_glitches,
        "bounce": clean.n_bounces,
        "runt": n_runts,
    }
    for reason, text in _REASONS.items():
        counts[text] = int(np.count_nonzero(widths.reason == reason))
    return tuple(Dropped(reason=text, count=n) for text, n in counts.items() if n)


def _notices(
    clean: CleanEdges, widths: Widths, n_scattered: int, n_runs: int
) -> tuple[Notice, ...]:
    notices: list[Notice] = []
    if clean.n_glitches:
        text = f"{clean.n_glitches} glitches were taken out, with the intervals they interrupt"
        notices.append(Notice(code="glitches", text=text))
    if clean.n_bounces:
        text = f"{clean.n_bounces} edges bounce: the first crossing of each was kept"
        notices.append(Notice(code="bounce", text=text))
    n_missing = int(np.count_nonzero(widths.reason == Reason.MISSING_PULSE))
    if n_missing:
        text = f"{n_missing} intervals are longer by whole periods and were left out"
        notices.append(Notice(code="missing-pulses", text=text))
    n_outliers = int(np.count_nonzero(widths.reason == Reason.OUTLIER))
    if n_outliers:
        text = f"{n_outliers} intervals lie far from the median and were left out"
        notices.append(Notice(code="outliers", text=text))
    if n_scattered:
        text = f"{n_scattered} intervals lie far from the median; too many to be exceptions, kept"
        notices.append(Notice(code="scattered-intervals", text=text))
    if n_runs > 1:
        text = f"the record has {n_runs - 1} gaps; no interval reaches across one"
        notices.append(Notice(code="gaps", text=text))
    return tuple(notices)
