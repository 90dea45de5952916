"""Rows of edges with exact truth for what their order says."""

from __future__ import annotations

import math

import numpy as np

from benchtool.model.capture import LogicTrace, TimeSpan
from benchtool.model.timing import Edges, Intervals
from benchtool.timing import find_edges, find_intervals

HIGH_S, LOW_S = 13.97, 10.75
"""The misting controller."""


def as_logic(times_s: np.ndarray, tick_s: float = 1e-4) -> LogicTrace:
    """Return edges, rising first, as a logic trace on a grid."""
    times_s = np.round(times_s / tick_s) * tick_s
    end_s = float(times_s[-1]) + 1.0
    return LogicTrace(
        times_s=times_s,
        states=np.arange(times_s.size) % 2 == 0,
        spans=(TimeSpan(start_s=0.0, end_s=end_s, starts_high=False),),
        tick_s=tick_s,
        channel="OUT",
    )


def seen(times_s: np.ndarray, tick_s: float = 1e-4) -> tuple[Intervals, Edges]:
    """Return the intervals of a row of edges, and the edges."""
    edges = find_edges(as_logic(times_s, tick_s), None)
    return find_intervals(edges), edges


def pulses(
    n: int,
    rng: np.random.Generator,
    *,
    jitter_rel: float = 1e-3,
    ripple_hz: float = 0.0,
    ripple_s: float = 0.0,
    drift_rel: float = 0.0,
    scale: float = 1.0,
) -> np.ndarray:
    """Return the edges of ``n`` periods whose ends a ripple moves by ``ripple_s``.

    Each interval ends where its own time, scattered, meets a threshold that swings; the time of
    that end is found by iteration, so that the edge lies where the ripple puts it; it holds for a
    ripple whose 2π·frequency·amplitude is below 1, which the node meets once. Over the record the
    intervals grow by ``drift_rel``.
    """
    times, now_s = [], 3.3 * scale
    for index in range(2 * n + 1):
        times.append(now_s)
        length_s = (HIGH_S if index % 2 == 0 else LOW_S) * scale * (1 + drift_rel * index / n / 2)
        plain_s = now_s + length_s * (1 + jitter_rel * rng.normal())
        end_s = plain_s
        for _ in range(50):
            end_s = plain_s + ripple_s * math.sin(2 * math.pi * ripple_hz * end_s + 0.4)
        now_s = end_s
    return np.array(times)
