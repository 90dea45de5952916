"""A watch on a counter: its readings since the last movement, without edges."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from benchtool.jobs.watch_movement import Scatter
from benchtool.model.arrays import FloatArray
from benchtool.model.counted import Counted, CountedName, Readings
from benchtool.model.result import StageResult
from benchtool.model.watch import WatchedName, WatchPlan
from benchtool.timing.counted import timing_of_counted

MOST_READINGS = 4096
"""Newest readings of each quantity that are averaged."""

_INVERSE: dict[WatchedName, CountedName] = {"period": "frequency", "frequency": "period"}


def readings_of(counted: Counted, quantity: WatchedName) -> FloatArray:
    """Return the readings of the watched quantity, or the inverse of those of its inverse.

    Returns:
        Shape (n,), in seconds, hertz or as a ratio; empty where the counter counts neither.
    """
    item = counted.readings.get(quantity)
    if item is not None:
        return item.values
    inverse = _INVERSE.get(quantity)
    other = counted.readings.get(inverse) if inverse else None
    return np.empty(0) if other is None else 1 / other.values


def join_counted(known: Counted | None, new: Counted) -> Counted:
    """Return the readings known with those of a further run, the newest of each at most."""
    if known is None or known.readings.keys() != new.readings.keys():
        return new
    joined = {name: _joined(known.readings[name], item) for name, item in new.readings.items()}
    return replace(new, readings=joined)


def _joined(known: Readings, new: Readings) -> Readings:
    values = np.concatenate([known.values, new.values])[-MOST_READINGS:]
    return replace(new, values=values, n_missing=known.n_missing + new.n_missing, chains=())


def scatter_of(counted: Counted, plan: WatchPlan, values: FloatArray) -> Scatter:
    """Return what is known of the scatter of readings beforehand; they are rounded at both ends."""
    typical = float(np.mean(values))
    rounding_rel = counted.resolution_s / math.sqrt(6)
    if plan.quantity == "frequency":
        rounding_rel *= typical
    else:
        rounding_rel /= typical
    return Scatter(
        assumed_rel=plan.jitter_rel / math.sqrt(3),
        least_rel=0.0 if plan.quantity == "duty" else rounding_rel,
        negligible_rel=0.0 if plan.quantity == "duty" else plan.timebase_rel / math.sqrt(3),
    )


def with_figures(result: StageResult, counted: Counted, plan: WatchPlan) -> StageResult:
    """Return the result with the figures of all readings since the last movement."""
    timing, jitter = timing_of_counted(counted, plan.timebase_rel, plan.jitter_rel)
    return replace(result, timing=timing, jitter=jitter, counted=counted)
