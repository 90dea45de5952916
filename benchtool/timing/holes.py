"""Missing samples: short holes are bridged by a straight line, long ones split the record."""

from __future__ import annotations

import numpy as np

from benchtool.timing.rows import Codes

BRIDGE = 3
"""Longest row of missing samples that is bridged by a straight line instead of split."""


def is_finite(value: np.generic) -> bool:
    """Tell whether a sample is there."""
    return bool(np.isfinite(value))


def open_hole(values: Codes) -> int:
    """Return how many missing samples at the end may belong to a hole that is still short."""
    if values.size == 0 or is_finite(values[-1]):
        return 0
    present = np.flatnonzero(np.isfinite(values[-(BRIDGE + 1) :]))
    missing = min(values.size, BRIDGE + 1) - (int(present[-1]) + 1 if present.size else 0)
    return missing if missing <= BRIDGE else 0


def bridged(values: Codes, before: float | None) -> Codes:
    """Fill short holes between present samples by straight lines.

    Args:
        values: Samples.
        before: The present sample just before them, None where there is none.
    """
    missing = ~np.isfinite(values)
    short = [
        np.arange(a, b)
        for a, b in _stretches(missing)
        if b - a <= BRIDGE and b < values.size and (a > 0 or before is not None)
    ]
    if not short:
        return values
    where, present = np.concatenate(short), np.flatnonzero(~missing)
    known = values[present]
    if before is not None:
        present, known = np.concatenate([[-1], present]), np.concatenate([[before], known])
    filled = values.copy()
    filled[where] = np.interp(where, present, known)
    return filled


def finite_runs(values: Codes) -> list[tuple[int, int]]:
    """Return the index ranges of present samples."""
    return _stretches(np.isfinite(values))


def _stretches(chosen: Codes) -> list[tuple[int, int]]:
    ends = np.flatnonzero(np.diff(np.concatenate([[False], chosen, [False]]).astype(np.int8)))
    return [(int(a), int(b)) for a, b in ends.reshape(-1, 2)]
