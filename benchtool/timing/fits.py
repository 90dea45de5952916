"""Fits of edges that more than two samples lie on: a common ramp, or a line or parabola each."""

from __future__ import annotations

from collections.abc import Iterable, Iterator

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, middle
from benchtool.timing.cutouts import Window
from benchtool.timing.ramps import find_ramp, place_on_ramp

_SHOWN = 1000  # edges that show their common shape
_CURVED = 2.0  # standard deviations of the mean curvature above which it is taken as real


@frozen_record
class Ramped:
    """What is known of edges beforehand, in sample units.

    Attributes:
        mid: Mid reference level.
        amplitude: Distance of the two states.
        noise: Standard deviation of a sample.
    """

    mid: float
    amplitude: float
    noise: float


@frozen_record(eq=False)
class FittedEdges:
    """Edges of one direction fitted by a common ramp, or each by a line or a parabola.

    Attributes:
        shift_s: Mid-level instant against the time of the edge's index, NaN without a fit, (n,).
        slew: Typical slope at the mid level in sample units per second, greater than 0.
        per_noise_s: Standard uncertainty of an instant for noise of one sample unit, seconds,
            of all edges or shape (n,).
    """

    shift_s: FloatArray
    slew: float
    per_noise_s: FloatArray | float


def fit_edges(
    windows: Iterable[Window], n_edges: int, mid: float, half: int, noise: float
) -> FittedEdges | None:
    """Fit the samples around each edge, within ``half`` samples of its crossing.

    Args:
        windows: The samples around the edges.
        n_edges: How many edges there are; some may have no window.
        mid: Mid reference level in sample units.
        half: Samples before and after the crossing.
        noise: Standard deviation of a sample, in sample units.

    Returns:
        The fits, or None where no edge has all its samples.
    """
    fitted = [
        (chosen, _coefficients(times, np.ascontiguousarray(values) - mid))
        for chosen, times, values in windows
    ]
    if not fitted:
        return None
    chosen = np.concatenate([part[0] for part in fitted])
    line, parabola, scale_s = (np.concatenate([part[1][i] for part in fitted]) for i in range(3))
    curved = _is_curved(parabola, noise, half)
    roots = _parabola_roots(parabola) if curved else -line[:, 0] / line[:, 1]
    slope = (parabola if curved else line)[:, 1] / scale_s
    slew = float(np.abs(middle(slope)))
    if slew == 0:
        return None
    good = (np.abs(roots) <= 1.0) & (np.sign(slope) == np.sign(middle(slope)))
    shift_s = np.full(n_edges, np.nan)
    shift_s[chosen[good]] = (roots * scale_s)[good]
    spread = 1.5 if curved else 1.0  # sd at the centre of a parabola against that of a line
    return FittedEdges(shift_s=shift_s, slew=slew, per_noise_s=spread / (slew * np.sqrt(2 * half)))


def fit_ramps(windows: Iterator[Window], rough_s: FloatArray, ramped: Ramped) -> FittedEdges | None:
    """Fit one ramp to all edges of a direction, and place each by all of its samples.

    Args:
        windows: The samples around the edges, so many that they hold all of an edge.
        rough_s: Instant of each edge by two samples, against the time of its index, shape (n,).
        ramped: Levels and noise.

    Returns:
        The fits, or None where the edges are not shown to be straight.
    """
    shift_s, count = np.full(rough_s.size, np.nan), np.zeros(rough_s.size)
    ramp = None
    for chosen, times, values in _shown_first(windows):
        above = values - ramped.mid
        if ramp is None:
            each = np.ascontiguousarray(above)
            ramp = find_ramp(times, each, rough_s[chosen], ramped.amplitude, ramped.noise)
        if ramp is None:
            return None
        shift_s[chosen], count[chosen] = place_on_ramp(times, above, rough_s[chosen], ramp)
    if ramp is None:
        return None
    shift_s[count == 0] = np.nan
    slew = abs(ramp.slope)
    per_noise_s = 1 / (slew * np.sqrt(np.maximum(count, 1.0)))
    return FittedEdges(shift_s=shift_s, slew=slew, per_noise_s=per_noise_s)


def _shown_first(windows: Iterator[Window]) -> Iterator[Window]:
    """Join the first windows, so that enough edges show their common shape."""
    held: list[Window] = []
    for window in windows:
        held.append(window)
        if sum(part[0].size for part in held) >= _SHOWN:
            break
    if held:
        chosen, times, values = (np.concatenate([part[i] for part in held]) for i in range(3))
        yield chosen, times, values
    yield from windows


def _coefficients(
    times: FloatArray, values: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return line and parabola of each row, over times scaled to -1..1, and the scale."""
    scale_s = np.abs(times).max(axis=1)
    x = times / scale_s[:, None]
    moments = [np.ones(len(x)) * x.shape[1], *(np.sum(x**k, axis=1) for k in range(1, 5))]
    sums = [np.sum(values * x**k, axis=1) for k in range(3)]
    return _solve(moments, sums, 2), _solve(moments, sums, 3), scale_s


def _solve(moments: list[FloatArray], sums: list[FloatArray], order: int) -> FloatArray:
    matrix = np.stack(
        [np.stack([moments[i + j] for j in range(order)], axis=-1) for i in range(order)], axis=-2
    )
    solved = np.linalg.solve(matrix, np.stack(sums[:order], axis=-1)[..., None])
    return np.asarray(solved[..., 0], dtype=np.float64)


def _is_curved(parabola: FloatArray, noise: float, half: int) -> bool:
    """Tell whether the mean curvature stands out of what the noise gives.

    The variance of the curvature over n points spread evenly on -1..1 is 45σ²/(4n).
    """
    u = noise * np.sqrt(45 / (4 * 2 * half) / len(parabola))
    return bool(abs(np.mean(parabola[:, 2])) > _CURVED * u)


def _parabola_roots(parabola: FloatArray) -> FloatArray:
    """Return the root nearest the centre, in the form that is safe for small curvature."""
    a, b, c = parabola[:, 2], parabola[:, 1], parabola[:, 0]
    inside = np.sqrt(np.maximum(b * b - 4 * a * c, 0.0))
    return -2 * c / (b + np.where(b < 0, -inside, inside))
