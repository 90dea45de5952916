"""Logic traces from lists of (time, state), whatever file they stood in."""

from __future__ import annotations

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
    last = np.append(times_s[1:] != times_s[:-1], True)  # of several at one time the last holds
    times_s, states = times_s[last], states[last]
    new = np.concatenate([[True], states[1:] != states[:-1]])
    times_s, states = times_s[new], states[new]
    known = states != UNKNOWN
    opens = known & np.concatenate([[True], ~known[:-1]])
    edges = known & ~opens
    if opens_with_edge:
        edges[0] = known[0]
    return LogicTrace(
        times_s=times_s[edges],
        states=states[edges] == 1,
        spans=_spans(times_s, states, opens, end_s, opens_with_edge=opens_with_edge),
        tick_s=tick_s,
        channel=channel,
        end_known=end_stated or end_s > times_s[-1],
    )


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
