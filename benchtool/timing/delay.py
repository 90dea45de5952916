"""The time from an edge of one trace to the answer of another."""

from __future__ import annotations

import math

import numpy as np

from benchtool.model.quantity import Contribution, Measured
from benchtool.model.timing import Edges
from benchtool.uncertainty import combine


def measure_delay(
    start: Edges, answer: Edges, *, timebase_rel: float = 50e-6, jitter_rel: float = 1e-3
) -> Measured | None:
    """Return the time from the first edge of one trace to the next edge of another.

    Args:
        start: Edges of the trace that begins, such as the supply.
        answer: Edges of the trace that answers.
        timebase_rel: Half-width of the timebase error, relative.
        jitter_rel: Half-width of the jitter assumed of the single delay, relative.

    Returns:
        The delay in seconds, None where either edge is missing.
    """
    if not start.times_s.size:
        return None
    later = np.flatnonzero(answer.times_s > start.times_s[0])
    if not later.size:
        return None
    value = float(answer.times_s[later[0]] - start.times_s[0])
    grids = [e.grid_s if e.resolved else e.step_s for e in (start, answer)]
    terms = [
        Contribution(source="assumed jitter", u=value * jitter_rel / math.sqrt(3)),
        Contribution(source="grid", u=math.hypot(*grids) / math.sqrt(12)),
        Contribution(source="edge noise", u=math.hypot(start.u_s[0], answer.u_s[later[0]])),
        Contribution(
            source="level", u=math.hypot(start.level_u_s, answer.level_u_s) / math.sqrt(2)
        ),
        Contribution(source="timebase", u=value * timebase_rel / math.sqrt(3), common=True),
    ]
    return combine(value, "s", terms)
