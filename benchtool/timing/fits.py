"""Fits of edges that more than two samples lie on: a common ramp, or a line or parabola each."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, middle
from benchtool.model.capture import UniformTime, Waveform
from benchtool.timing.pieces import Index, walk_pieces
from benchtool.timing.ramps import find_ramp, place_on_ramp
from benchtool.timing.rows import Codes

_MOST = 1 << 19  # samples of windows that are fitted at once
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
    waveform: Waveform, index: Index, mid: float, half: int, noise: float
) -> FittedEdges | None:
    """Fit the samples around each edge, within ``half`` samples of its crossing.

    Args:
        waveform: The trace; walked once.
        index: Index of the first sample past the mid level, ascending, shape (n,).
        mid: Mid reference level in sample units.
        half: Samples before and after the crossing.
        noise: Standard deviation of a sample, in sample units.

    Returns:
        The fits, or None where no edge has all its samples.
    """
    windows = [
        (chosen, _coefficients(times, values - mid))
        for chosen, times, values in _windows(waveform, index, half)
    ]
    if not windows:
        return None
    chosen = np.concatenate([window[0] for window in windows])
    line, parabola, scale_s = (
        np.concatenate([window[1][i] for window in windows]) for i in range(3)
    )
    curved = _is_curved(parabola, noise, half)
    roots = _parabola_roots(parabola) if curved else -line[:, 0] / line[:, 1]
    slope = (parabola if curved else line)[:, 1] / scale_s
    slew = float(np.abs(middle(slope)))
    if slew == 0:
        return None
    good = (np.abs(roots) <= 1.0) & (np.sign(slope) == np.sign(middle(slope)))
    shift_s = np.full(index.size, np.nan)
    shift_s[chosen[good]] = (roots * scale_s)[good]
    spread = 1.5 if curved else 1.0  # sd at the centre of a parabola against that of a line
    return FittedEdges(shift_s=shift_s, slew=slew, per_noise_s=spread / (slew * np.sqrt(2 * half)))


def fit_ramps(
    waveform: Waveform, index: Index, rough_s: FloatArray, ramped: Ramped, half: int
) -> FittedEdges | None:
    """Fit one ramp to all edges of a direction, and place each by all of its samples.

    Args:
        waveform: The trace; walked once.
        index: Index of the first sample past the mid level, ascending, shape (n,).
        rough_s: Instant of each edge by two samples, against the time of its index, shape (n,).
        ramped: Levels and noise.
        half: Samples before and after the crossing that hold all of an edge.

    Returns:
        The fits, or None where the edges are not shown to be straight.
    """
    shift_s, count = np.full(index.size, np.nan), np.zeros(index.size)
    ramp = None
    for chosen, times, values in _shown_first(_windows(waveform, index, half)):
        above = values - ramped.mid
        if ramp is None:
            ramp = find_ramp(times, above, rough_s[chosen], ramped.amplitude, ramped.noise)
        if ramp is None:
            return None
        shift_s[chosen], count[chosen] = place_on_ramp(times, above, rough_s[chosen], ramp)
    if ramp is None:
        return None
    shift_s[count == 0] = np.nan
    slew = abs(ramp.slope)
    per_noise_s = 1 / (slew * np.sqrt(np.maximum(count, 1.0)))
    return FittedEdges(shift_s=shift_s, slew=slew, per_noise_s=per_noise_s)


def _shown_first(
    windows: Iterator[tuple[Index, FloatArray, FloatArray]],
) -> Iterator[tuple[Index, FloatArray, FloatArray]]:
    """Join the first windows, so that enough edges show their common shape."""
    held: list[tuple[Index, FloatArray, FloatArray]] = []
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


def _windows(
    waveform: Waveform, index: Index, half: int
) -> Iterator[tuple[Index, FloatArray, FloatArray]]:
    """Yield which edges, their window times against the edge's index, and their samples."""
    done = 0
    tail_values: Codes = np.empty(0)
    tail_s: FloatArray = np.empty(0)
    for piece in walk_pieces(waveform):
        keep = 0 if piece.begins_run else tail_values.size
        values = np.concatenate([tail_values[tail_values.size - keep :], piece.values])
        times = piece.times_s
        if times is not None:
            times = np.concatenate([tail_s[tail_s.size - keep :], times])
        first = piece.first - keep
        stop = first + values.size
        until = int(np.searchsorted(index, stop - half, side="right"))
        inside = np.arange(done, until)
        inside = inside[(index[inside] - half >= first) & (index[inside] + half <= stop)]
        done = max(done, until)
        yield from _cut(waveform, inside, index[inside] - first, values, times, half)
        tail_values = values[-2 * half :]
        tail_s = times[-2 * half :] if times is not None else tail_s


def _cut(
    waveform: Waveform,
    which: Index,
    at: Index,
    values: Codes,
    times: FloatArray | None,
    half: int,
) -> Iterator[tuple[Index, FloatArray, FloatArray]]:
    offsets = np.arange(-half, half)
    step = max(1, _MOST // (2 * half))
    dt_s = waveform.time.dt_s if isinstance(waveform.time, UniformTime) else 0.0
    for start in range(0, which.size, step):
        rows = at[start : start + step, None] + offsets
        if times is None:
            against = np.broadcast_to(offsets * dt_s, rows.shape)
        else:
            against = times[rows] - times[at[start : start + step], None]
        yield which[start : start + step], against, values[rows].astype(np.float64)
