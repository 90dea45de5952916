"""Where a curve turns: the intersection of fits on both sides of its peak."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray

_NEAR, _FAR = 0.15, 0.30  # of the swing below the extreme: two levels on each side
_FITTED = 0.35  # of the swing: samples this close to the extreme are fitted
_FITTED_COARSE, _COARSE = 0.48, 24  # the same where so few samples are that close
_TIP = 0.05  # of the swing below the extreme: a turn spends a sixth of its time to 30 % there
_RESTING = 0.35  # share of that time from which the curve rests at the extreme
_LEAST_TO_REST = 12  # samples without which rest cannot be told
_ROUNDS = 8
_FINE = 100  # a turn that moves by less than this part of the window has settled
_CUBIC_FROM, _PARABOLA_FROM, _LINE_FROM = 16, 6, 3
_CUBIC_NOISE, _PARABOLA_NOISE = 5e-4, 1e-2
"""Noise of a side's mean, over the swing, up to which the curvature is worth its noise.

A parabola through the last 35 % of an exponential errs by 2e-4 of the swing, a line by 7e-3.
"""


@frozen_record(eq=False)
class Turn:
    """A turning point: its time, standard uncertainty, direction, and whether it was fitted."""

    time_s: float
    u_s: float
    is_peak: bool
    is_fitted: bool

    def as_trough(self) -> Turn:
        """Return the same point as a trough."""
        return replace(self, is_peak=False)


@frozen_record(eq=False)
class _Side:
    """A polynomial through the samples on one side, over times against the turn."""

    coefficients: FloatArray
    u: float


def locate_turn(
    times_s: FloatArray, values: FloatArray, swing: float, noise: float, *, whole: bool
) -> Turn | None:
    """Locate the peak of a stretch of a curve.

    Args:
        times_s: Times of the samples in seconds, shape (n,).
        values: Samples, the peak upwards, shape (n,).
        swing: Distance of peak and trough in the unit of the samples.
        noise: Standard deviation of a sample.
        whole: Whether the stretch goes from one crossing of the mid level to the next; of a cut
            one it is not known that it holds a peak.

    Returns:
        The peak, or None where a cut stretch does not show one.
    """
    if values.size < 2 or (not whole and not _shows_peak(values, swing, noise)):
        return None
    top = _smoothed_max(values)
    wide = np.flatnonzero(values > top - _FITTED * swing)
    if wide.size < _COARSE:
        wide = np.flatnonzero(values > top - _FITTED_COARSE * swing)
    start, stop = int(wide[0]), int(wide[-1]) + 1
    near = np.flatnonzero(values > top - _NEAR * swing)
    rests = _rests(values, top, swing)
    at = _meeting_of_chords(times_s, values, top, swing, rests=rests)
    at = min(max(at, start), stop - 1)
    if rests:
        start = max(start, 2 * at - stop)
    steep = _Steep(left=int(near[0]), right=int(near[-1]))
    return _refine(times_s, values / swing, (start, stop), at, noise / swing, steep)


@frozen_record(eq=False)
class _Steep:
    """First and last sample near the extreme: where the turn lies if a side has no more."""

    left: int
    right: int


def _meeting_of_chords(
    times_s: FloatArray, values: FloatArray, top: float, swing: float, *, rests: bool
) -> int:
    """Return the sample nearest to where chords on both sides meet.

    The chords go through the levels 15 % and 30 % of the swing below the extreme. Where the
    curve rests at the extreme before it leaves, the chord of leaving meets the extreme itself.
    """
    near, far = (np.flatnonzero(values > top - part * swing) for part in (_NEAR, _FAR))
    left_s = float(times_s[near[0]]), float(times_s[far[0]])
    right_s = float(times_s[near[-1]]), float(times_s[far[-1]])
    rise, fall = left_s[0] - left_s[1], right_s[1] - right_s[0]  # seconds for 15 % of the swing
    if rests:
        meet_s = right_s[0] - fall * _NEAR / (_FAR - _NEAR)
    else:
        share = rise / (rise + fall) if rise + fall > 0 else 0.5
        meet_s = left_s[0] + share * (right_s[0] - left_s[0])
    return int(np.searchsorted(times_s, meet_s))


def _rests(values: FloatArray, top: float, swing: float) -> bool:
    """Tell whether the curve stays at its extreme for a while before it leaves."""
    far = int(np.count_nonzero(values > top - _FAR * swing))
    tip = int(np.count_nonzero(values > top - _TIP * swing))
    return far >= _LEAST_TO_REST and tip > _RESTING * far


def _smoothed_max(values: FloatArray) -> float:
    width = max(1, values.size // 200)
    if width == 1:
        return float(values.max())
    total = np.concatenate([[0.0], np.cumsum(values)])
    return float(np.max(total[width:] - total[:-width]) / width)


def _shows_peak(values: FloatArray, swing: float, noise: float) -> bool:
    """Tell whether a cut stretch turns: its extreme stands out above both ends."""
    clear = max(0.15 * swing, 8 * noise)
    top = _smoothed_max(values)
    return bool(top - values[0] > clear and top - values[-1] > clear)


def _refine(
    times_s: FloatArray,
    values: FloatArray,
    window: tuple[int, int],
    at: int,
    noise: float,
    steep: _Steep,
) -> Turn:
    """Intersect the fits on both sides, and do so again from where they meet."""
    start, stop = window
    scale_s = float(times_s[stop - 1] - times_s[start]) or 1.0
    result: Turn | None = None
    for _ in range(_ROUNDS):
        origin_s = float(times_s[at])
        x, y = (times_s[start:stop] - origin_s) / scale_s, values[start:stop]
        left, right = _fit(x[x < 0], y[x < 0], noise), _fit(x[x >= 0], y[x >= 0], noise)
        if left is None or right is None:
            break
        met = _meeting(left, right)
        if met is None:
            break
        slope = abs(left.coefficients[1] - right.coefficients[1])
        result = Turn(
            time_s=origin_s + met * scale_s,
            u_s=math.hypot(left.u, right.u) / slope * scale_s,
            is_peak=True,
            is_fitted=True,
        )
        moved = min(max(int(np.searchsorted(times_s, result.time_s)), start + 1), stop - 2)
        if abs(moved - at) * _FINE < stop - start:
            break
        at = moved
    return result or _sampled(times_s, steep, window)


def _sampled(times_s: FloatArray, steep: _Steep, window: tuple[int, int]) -> Turn:
    """Place a turn beside a side too steep to fit: half way to the first sample beyond it."""
    right_is_steep = window[1] - steep.right < steep.left - window[0] + 1
    last = steep.right if right_is_steep else steep.left - 1
    last = min(max(last, 0), times_s.size - 2)
    step_s = float(times_s[last + 1] - times_s[last])
    if step_s <= 0:
        step_s = float(times_s[-1] - times_s[0]) / times_s.size
    return Turn(
        time_s=float(times_s[last]) + step_s / 2,
        u_s=step_s / math.sqrt(12),
        is_peak=True,
        is_fitted=False,
    )


def _fit(x: FloatArray, y: FloatArray, noise: float) -> _Side | None:
    """Fit a polynomial over values in swings, with the standard uncertainty of its end.

    The end of a polynomial of degree p over n even points has the variance (p + 1)²σ²/n.
    """
    if x.size < _LINE_FROM:
        return None
    own = noise / math.sqrt(x.size)
    degree = 1
    if x.size >= _PARABOLA_FROM and own <= _PARABOLA_NOISE:
        degree = 3 if x.size >= _CUBIC_FROM and own <= _CUBIC_NOISE else 2
    powers = np.vander(x, degree + 1, increasing=True)
    solution = np.linalg.lstsq(powers, y, rcond=None)[0]
    padded = np.concatenate([solution, np.zeros(3 - degree)])
    return _Side(coefficients=padded, u=(degree + 1) * own)


def _meeting(left: _Side, right: _Side) -> float | None:
    """Return where two polynomials meet nearest the origin, by Newton's method."""
    d = left.coefficients - right.coefficients
    x = 0.0
    for _ in range(30):
        value = d[0] + x * (d[1] + x * (d[2] + x * d[3]))
        slope = d[1] + x * (2 * d[2] + 3 * x * d[3])
        if slope == 0:
            return None
        step = value / slope
        x -= step
        if abs(x) > 1:
            return None
        if abs(step) < 1e-12:
            return float(x)
    return None
