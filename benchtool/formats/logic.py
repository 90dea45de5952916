"""Logic traces from lists of (time, state), whatever file they stood in."""

from __future__ import annotations

from typing import TypeVar

import numpy as np

from benchtool.model.arrays import FloatArray, NDArray
from benchtool.model.capture import LogicTrace, TimeSpan

UNKNOWN = -1

States = NDArray[np.int8]


def logic_trace(
    times_s: FloatArray,
    states: States,
    *,
    end_s: float,
    tick_s: float,
    channel: str,
    end_stated: bool,
    opens_with_edge: bool = False,
) -> LogicTrace:
    """Build a logic trace from the states of a channel and when each was taken on.

    Args:
        times_s: Seconds after the start of the record, not decreasing, shape (n,), n >= 1.
        states: 1 high, 0 low, -1 unknown (a gap), shape (n,); repeated states are no edges.
        end_s: End of the record.
        tick_s: Resolution of the times.
        channel: Name.
        end_stated: Whether ``end_s`` is stated rather than the last edge.
        opens_with_edge: Whether the first entry is itself an edge, not a state found.
    """
    times_s, states = _kept(times_s, states, times_s[1:] != times_s[:-1], at_end=True)
    times_s, states = _kept(times_s, states, states[1:] != states[:-1], at_end=False)
    known = states != UNKNOWN
    opens = known.copy()
    opens[1:] &= ~known[:-1]
    edges = known & ~opens
    if opens_with_edge:
        edges[0] = known[0]
    return LogicTrace(
        times_s=_chosen(times_s, edges),
        states=_chosen(states == 1, edges),
        spans=_spans(times_s, states, opens, end_s, opens_with_edge=opens_with_edge),
        tick_s=tick_s,
        channel=channel,
        end_known=end_stated or end_s > times_s[-1],
    )


def _kept(
    times_s: FloatArray, states: States, differs: NDArray[np.bool_], *, at_end: bool
) -> tuple[FloatArray, States]:
    """Return the entries that differ from a neighbour.

    Of several at one time the last is kept (``at_end``), of several alike the first.
    """
    if differs.all():
        return times_s, states
    kept = np.append(differs, True) if at_end else np.append(True, differs)
    return times_s[kept], states[kept]


_Row = TypeVar("_Row", bound=np.generic)


def _chosen(row: NDArray[_Row], chosen: NDArray[np.bool_]) -> NDArray[_Row]:
    """Return the chosen entries; a view where they are all but the first."""
    return row[1:] if chosen[1:].all() and not chosen[0] else row[chosen]


def _spans(
    times_s: FloatArray,
    states: States,
    opens: NDArray[np.bool_],
    end_s: float,
    *,
    opens_with_edge: bool,
) -> tuple[TimeSpan, ...]:
    """Return the pieces in which the state is known."""
    unknown = np.flatnonzero(states == UNKNOWN)
    spans = []
    for i in np.flatnonzero(opens):
        after = unknown[np.searchsorted(unknown, i) :][:1]
        stop = float(times_s[after[0]]) if after.size else end_s
        high = bool(states[i] == 1) != (opens_with_edge and i == 0)
        spans.append(TimeSpan(start_s=float(times_s[i]), end_s=stop, starts_high=high))
    return tuple(spans)
