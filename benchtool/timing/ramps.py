"""Straight edges: where a ramp of known slope crosses the mid level, from every sample on it."""

from __future__ import annotations

import math

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, FloatArray, middle

_USED = 0.96  # of the ramp: its ends are rounded, and where they lie is not known exactly
_LEAST_STEPS = 8  # steps between neighbouring samples that tell whether an edge is straight
_BENT = 0.1  # change of the slope from the middle to an end that is taken for noise
_UNSURE = 0.25  # standard uncertainty of it from which straightness is not told
_ROUNDS = 3
_PAIRWISE = 8  # numbers in a row from which numpy adds them in another order


@frozen_record(eq=False)
class Ramp:
    """The common shape of straight edges of one direction.

    Attributes:
        slope: Slope in sample units per second, with its sign.
        reach_s: Distance from the mid level within which samples are used, seconds.
    """

    slope: float
    reach_s: float


def find_ramp(
    times_s: FloatArray, above: FloatArray, rough_s: FloatArray, amplitude: float, noise: float
) -> Ramp | None:
    """Return the ramp that edges have in common, None where they are not shown to be straight.

    Args:
        times_s: Times of the samples around each edge, shape (edges, samples).
        above: Samples less the mid level, of that shape.
        rough_s: Instant of each edge as two samples give it, shape (edges,).
        amplitude: Distance of the states, in sample units.
        noise: Standard deviation of a sample, in sample units.
    """
    middle_s = (times_s[:, 1:] + times_s[:, :-1]) / 2 - rough_s[:, None]
    slopes = np.diff(above, axis=1) / np.diff(times_s, axis=1)
    away_s = np.abs(times_s - rough_s[:, None])
    outer_s = np.maximum(away_s[:, 1:], away_s[:, :-1])
    slope = middle(slopes[np.abs(middle_s) == np.abs(middle_s).min(axis=1)[:, None]])
    for _ in range(_ROUNDS):
        if slope == 0:
            return None
        reach_s = _USED / 2 * amplitude / abs(slope)
        on = outer_s <= reach_s
        if np.count_nonzero(on) < _LEAST_STEPS:
            return None
        slope = _slope(times_s, above, away_s <= reach_s)
    step_s = float(np.mean(np.diff(times_s, axis=1)))
    bent = _is_bent(middle_s[on] / reach_s, slopes[on] / slope, noise / abs(slope) / step_s)
    return None if bent else Ramp(slope=slope, reach_s=reach_s)


def _slope(times_s: FloatArray, above: FloatArray, on: BoolArray) -> float:
    """Return the slope from samples against the mean of their own edge."""
    n = np.maximum(1, np.count_nonzero(on, axis=1))[:, None]
    x = np.where(on, times_s - np.sum(times_s, axis=1, where=on, keepdims=True) / n, 0.0)
    return float(np.sum(x * above) / np.sum(x * x))


def _is_bent(place: FloatArray, slope: FloatArray, noise_rel: float) -> bool:
    """Tell whether the slope changes along the edge, or may do so without being seen.

    Args:
        place: Where on the ramp, -1 to 1, shape (n,).
        slope: Slope there over the mean slope.
        noise_rel: Noise of a sample over what the ramp rises between two of them.
    """
    if place.size < _LEAST_STEPS:
        return True
    shapes = np.stack([np.ones(place.size), place, place**2 - np.mean(place**2)])
    normal = shapes @ shapes.T
    if np.linalg.cond(normal) > 1e6:
        return False  # all steps lie at the middle: a ramp of two samples has no other
    change = np.linalg.solve(normal, shapes @ slope)[1:]
    u = math.sqrt(2) * noise_rel * np.sqrt(np.diag(np.linalg.inv(normal))[1:])
    return bool(np.any(np.abs(change) > np.maximum(_BENT, 2.5 * u)) or np.any(u > _UNSURE))


def place_on_ramp(
    times_s: FloatArray, above: FloatArray, rough_s: FloatArray, ramp: Ramp
) -> tuple[FloatArray, FloatArray]:
    """Return the instant of each edge, and how many samples it was made of (0: as it was).

    Args:
        times_s: Times of the samples around each edge, shape (edges, samples).
        above: Samples less the mid level, of that shape.
        rough_s: Instant of each edge as two samples give it, shape (edges,).
        ramp: The ramp.
    """
    if times_s.shape[1] >= _PAIRWISE:
        return _placed(times_s, np.ascontiguousarray(above), rough_s, ramp)
    return _placed_across(times_s.T, np.ascontiguousarray(above.T), rough_s, ramp)


def _placed(
    times_s: FloatArray, above: FloatArray, rough_s: FloatArray, ramp: Ramp
) -> tuple[FloatArray, FloatArray]:
    """Return what ``place_on_ramp`` does, edge by edge."""
    crossing_s, shift_s = times_s - above / ramp.slope, rough_s
    for _ in range(_ROUNDS):
        on = np.abs(times_s - shift_s[:, None]) <= ramp.reach_s
        n = np.count_nonzero(on, axis=1)
        total_s = np.sum(crossing_s, axis=1, where=on)
        shift_s = np.where(n > 0, total_s / np.maximum(n, 1), rough_s)
    return shift_s, n.astype(np.float64)


def _placed_across(
    times_s: FloatArray, above: FloatArray, rough_s: FloatArray, ramp: Ramp
) -> tuple[FloatArray, FloatArray]:
    """Return what ``_placed`` does, for arrays of shape (samples, edges): all edges at once.

    Fewer than eight numbers are added one after another either way, so the sums are the same.
    """
    crossing_s, shift_s = times_s - above / ramp.slope, rough_s
    away_s, on = np.empty_like(crossing_s), np.empty(crossing_s.shape, np.bool_)
    for _ in range(_ROUNDS):
        np.subtract(times_s, shift_s, out=away_s)
        np.less_equal(np.abs(away_s, out=away_s), ramp.reach_s, out=on)
        n = np.add.reduce(on.view(np.uint8), axis=0, dtype=np.uint8)
        total_s = np.add.reduce(np.multiply(crossing_s, on, out=away_s), axis=0)
        shift_s = np.where(n > 0, total_s / np.maximum(n, 1), rough_s)
    return shift_s, n.astype(np.float64)
