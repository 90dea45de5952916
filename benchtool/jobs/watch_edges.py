"""Edges of one capture after another on one axis of time, none of them counted twice."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from benchtool.model.timing import EdgeRun, Edges

MOST_EDGES = 8192
"""Newest edges that are averaged: 4,096 periods, after which the timebase rules nearly always."""

_SAME_GRID = 0.01
_NEAR = 0.25  # of the shortest width: two times closer than that are one edge


def join_edges(known: Edges | None, new: Edges, offset_s: float | None) -> Edges:
    """Return the edges known with those of a further capture.

    Args:
        known: Edges so far on the common axis; None at first.
        new: Edges of the further capture, seconds after its own start.
        offset_s: Where its start lies on the common axis; None for a record of its own, which is
            put behind all others with a gap between.

    Returns:
        All edges in order, the newest ``MOST_EDGES`` at most. Those of a capture that was taken
        otherwise, on another grid, replace all before.
    """
    if known is None or not known.runs or not are_alike(known, new):
        return newest_edges(_shifted(new, offset_s or 0.0), MOST_EDGES)
    if offset_s is None:
        return newest_edges(_appended(known, _shifted(new, _behind(known, new))), MOST_EDGES)
    shifted = _shifted(new, offset_s)
    return newest_edges(_continued(known, shifted), MOST_EDGES)


def are_alike(known: Edges, new: Edges) -> bool:
    """Tell whether two captures were taken on the same grid, so that one budget holds for both."""
    return abs(known.step_s - new.step_s) <= _SAME_GRID * max(known.step_s, new.step_s)


def _shifted(edges: Edges, by_s: float) -> Edges:
    runs = tuple(
        replace(run, start_s=run.start_s + by_s, end_s=run.end_s + by_s) for run in edges.runs
    )
    return replace(edges, times_s=edges.times_s + by_s, runs=runs)


def _behind(known: Edges, new: Edges) -> float:
    """Return an offset that leaves a gap as long as the new record, in whole steps."""
    if not new.runs:
        return 0.0
    by_s = known.runs[-1].end_s + new.runs[-1].end_s - 2 * new.runs[0].start_s
    return np.ceil(by_s / new.step_s) * new.step_s if new.step_s else by_s


def _continued(known: Edges, new: Edges) -> Edges:
    """Add what lies behind the last edge known; the run goes on where the captures overlap."""
    first = int(np.searchsorted(new.times_s, _last(known) + _nearness(new), side="right"))
    runs = [run for run in new.runs if run.stop > first or run.end_s > known.runs[-1].end_s]
    if not runs:
        return known
    rest = replace(
        new,
        times_s=new.times_s[first:],
        rising=new.rising[first:],
        u_s=new.u_s[first:],
        runs=tuple(
            replace(run, first=max(0, run.first - first), stop=max(0, run.stop - first))
            for run in runs
        ),
    )
    if runs[0].start_s > known.runs[-1].end_s + new.step_s:
        return _appended(known, rest)
    if rest.runs[0].stop and rest.rising[0] == _ends_high(known):
        return _appended(known, rest)  # an edge is missing between the two
    return _appended(known, rest, goes_on=True)


def _last(edges: Edges) -> float:
    return float(edges.times_s[-1]) if edges.times_s.size else edges.runs[0].start_s


def _ends_high(edges: Edges) -> bool:
    last = edges.runs[-1]
    return bool(edges.rising[last.stop - 1]) if last.stop > last.first else last.starts_high


def _nearness(edges: Edges) -> float:
    if edges.times_s.size < 2:
        return edges.step_s / 2
    return max(edges.step_s / 2, _NEAR * float(np.diff(edges.times_s).min()))


def _appended(known: Edges, new: Edges, *, goes_on: bool = False) -> Edges:
    """Put edges behind those known, into the last run where it goes on."""
    by = known.times_s.size
    moved = [replace(run, first=run.first + by, stop=run.stop + by) for run in new.runs]
    runs = list(known.runs)
    if goes_on and moved:
        runs[-1] = replace(runs[-1], stop=moved[0].stop, end_s=moved[0].end_s)
        moved = moved[1:]
    return replace(
        new,
        times_s=np.concatenate([known.times_s, new.times_s]),
        rising=np.concatenate([known.rising, new.rising]),
        u_s=np.concatenate([known.u_s, new.u_s]),
        runs=(*runs, *moved),
        resolved=known.resolved and new.resolved,  # else the grid stands for all of them
        level_u_s=max(known.level_u_s, new.level_u_s),
        grid_s=max(known.grid_s, new.grid_s),
        stretch_u_rel=max(known.stretch_u_rel, new.stretch_u_rel),
        n_runts=known.n_runts + new.n_runts,
    )


def edges_from(edges: Edges, start_s: float) -> Edges:
    """Return the edges from a time on; the run that it cuts begins with its first edge."""
    first = int(np.searchsorted(edges.times_s, start_s - _nearness(edges) / 4))
    return newest_edges(edges, edges.times_s.size - first)


def newest_edges(edges: Edges, n: int) -> Edges:
    """Return the last ``n`` edges with their runs."""
    first = edges.times_s.size - n
    if first <= 0:
        return edges
    return replace(
        edges,
        times_s=edges.times_s[first:],
        rising=edges.rising[first:],
        u_s=edges.u_s[first:],
        runs=tuple(_cut(run, first, edges) for run in edges.runs if run.stop > first)
        or _open_end(edges),
    )


def _cut(run: EdgeRun, first: int, edges: Edges) -> EdgeRun:
    if run.first >= first:
        return replace(run, first=run.first - first, stop=run.stop - first)
    return EdgeRun(
        first=0,
        stop=run.stop - first,
        start_s=float(edges.times_s[first]),
        end_s=run.end_s,
        starts_high=not edges.rising[first],
    )


def _open_end(edges: Edges) -> tuple[EdgeRun, ...]:
    """Return the rest of the last run, which holds no edge any more."""
    last = edges.runs[-1]
    start_s = float(edges.times_s[last.stop - 1]) if last.stop > last.first else last.start_s
    return (
        EdgeRun(first=0, stop=0, start_s=start_s, end_s=last.end_s, starts_high=_ends_high(edges)),
    )
