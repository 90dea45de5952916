"""The time from an edge of one trace to the answer of another."""

from __future__ import annotations

import math

import numpy as np

from benchtool.model.options import JITTER_REL, TIMEBASE_REL
from benchtool.model.quantity import Bound, Contribution, Quantity
from benchtool.model.timing import Edges
from benchtool.uncertainty import combine

_WITH_SUPPLY = 0.02
"""Share of the wait within which an output that rises is taken to rise with its supply."""


def measure_delay(
    start: Edges,
    answer: Edges,
    *,
    timebase_rel: float = TIMEBASE_REL,
    jitter_rel: float = JITTER_REL,
    powers: bool = False,
) -> Quantity | None:
    """Return the time from the first edge of one trace to the next edge of another.

    Args:
        start: Edges of the trace that begins, such as the supply.
        answer: Edges of the trace that answers.
        timebase_rel: Half-width of the timebase error, relative.
        jitter_rel: Half-width of the jitter assumed of the single delay, relative.
        powers: Whether the first trace supplies the other, so that a rise of the answer together
            with it is no answer.

    Returns:
        The delay in seconds, a lower bound where no answer comes, None where nothing begins.
    """
    if not start.times_s.size or not answer.runs:
        return None
    begun_s = float(start.times_s[0])
    index = _answering(start, answer, powers=powers)
    if index is None:
        waited_s = answer.runs[-1].end_s - begun_s
        return Bound(unit="s", at_least=waited_s) if waited_s > 0 else None
    value = float(answer.times_s[index]) - begun_s
    grids = [e.grid_s if e.resolved else e.step_s for e in (start, answer)]
    terms = [
        Contribution(source="assumed jitter", u=value * jitter_rel / math.sqrt(3)),
        Contribution(source="grid", u=math.hypot(*grids) / math.sqrt(12)),
        Contribution(source="edge noise", u=math.hypot(start.u_s[0], answer.u_s[index])),
        Contribution(
            source="level", u=math.hypot(start.level_u_s, answer.level_u_s) / math.sqrt(2)
        ),
        Contribution(source="timebase", u=value * timebase_rel / math.sqrt(3), common=True),
    ]
    return combine(value, "s", terms)


def _answering(start: Edges, answer: Edges, *, powers: bool) -> int | None:
    """Return the index of the edge that answers, None where none does."""
    begun_s = float(start.times_s[0])
    together_s = begun_s - 2 * max(start.step_s, answer.step_s) if powers else begun_s
    later = np.flatnonzero(answer.times_s > together_s)
    if not later.size:
        return None
    first = int(later[0])
    after = later[1:2]
    next_s = float(answer.times_s[after[0]]) if after.size else answer.runs[-1].end_s
    risen_s = float(answer.times_s[first]) - begun_s
    if powers and answer.rising[first] and risen_s < _WITH_SUPPLY * (next_s - begun_s):
        return int(after[0]) if after.size else None
    return first
