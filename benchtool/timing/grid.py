"""What the sampling grid alone does to the mean of intervals."""

from __future__ import annotations

import math

import numpy as np

from benchtool.model.arrays import FloatArray

_HARMONICS = 20
_STRONG = 0.0015  # variance in steps squared from which all further harmonics are gone
_MOST_LAGS = 1 << 20
_BEATS = 4  # periods together that may lie in step with the grid
_NO_TURN = 0.3  # turns of a beat that the best line shows where there is none
_BEATEN = 30  # periods from which a beat would rarely hide
_TILT = 0.6  # of a line through one turn of a saw-tooth: 6/π², steps
_HALVINGS = 40
_HIDDEN, _FEW_HIDE = 2.0, 8.0
_SHOWN = 3.0
UNSEEN = 1.6  # edge noise that n edges may hide in a fit, times n, grid steps
_PERIOD_ERROR = tuple((away / 3, (3 - abs(away)) / 9) for away in range(-2, 3))
"""A triangle of half-width 1 in five points: their places and shares."""


def period_floor(step_s: float, n: int, n_chains: int = 1) -> float:
    """Return the standard uncertainty that the grid gives the mean of n periods, in seconds.

    Only the first and the last edge of each succession count: Ts·√chains/(n√6).

    Args:
        step_s: Grid step Ts in seconds.
        n: Number of periods, 1 or more.
        n_chains: Number of successions without a gap, 1 or more.
    """
    return step_s * math.sqrt(n_chains) / (n * math.sqrt(6))


def width_floor(
    step_s: float, n: int, period_s: float | None, jitter_s2: float = 0.0, edge_s2: float = 0.0
) -> float:
    """Return the standard uncertainty that the grid gives the mean of n widths, in seconds.

    Args:
        step_s: Grid step Ts in seconds.
        n: Number of widths.
        period_s: Their spacing in seconds, None where unknown (then as if independent).
        jitter_s2: Variance a period of accumulating noise, s²; it moves edges off the grid.
        edge_s2: Variance of an edge's own noise, s².

    References:
        u² = Ts²[1/(6n) + (2/n²)·Σ_{m=1}^{n-1}(n-m)(d² - d + 1/6)], d = frac(m·T/Ts): the
        covariance of rounding errors m periods apart. With noise, harmonic k of
        d² - d + 1/6 = π⁻²·Σ cos(2πkd)/k² shrinks by exp(-2π²k²·var/Ts²).
    """
    if step_s == 0 or n == 0:
        return 0.0
    if period_s is None or n == 1:
        return step_s / math.sqrt(6 * n)
    m = np.arange(1, min(n, _MOST_LAGS), dtype=np.float64)
    related = rounding_covariance(
        m * (period_s / step_s), (m * jitter_s2 + 2 * edge_s2) / step_s**2
    )
    total = 1 / (6 * n) + 2 / n**2 * float(np.sum((n - m) * related))
    return step_s * math.sqrt(max(total, 1 / (6 * n * n)))


def blurred_width_floor(
    step_s: float,
    n: int,
    period_s: float,
    u_period_s: float,
    jitter_s2: float = 0.0,
    edge_s2: float = 0.0,
) -> float:
    """Return ``width_floor`` where the period itself was measured on the grid, in seconds.

    Its error hides whether the edges lie in step with the grid, where u is far larger: the mean
    square over a triangle of that standard deviation. (The largest over it would need no chance
    at all, and be twice what 95 % of errors need.)

    Args:
        step_s: As for ``width_floor``, and so are the others.
        n: Number of widths.
        period_s: Their spacing as measured.
        u_period_s: Standard uncertainty of that, seconds.
        jitter_s2: Variance a period of accumulating noise.
        edge_s2: Variance of an edge's own noise.
    """
    half_s = math.sqrt(6) * u_period_s
    squares = (
        share * width_floor(step_s, n, period_s + away * half_s, jitter_s2, edge_s2) ** 2
        for away, share in _PERIOD_ERROR
    )
    return math.sqrt(math.fsum(squares))


def line_period(ticks: FloatArray) -> float:
    """Return the slope of the least-squares line through edges, in their unit.

    Args:
        ticks: Edge times of one direction in order, shape (n,) with n >= 2.
    """
    k = np.arange(ticks.size) - (ticks.size - 1) / 2
    return float(k @ (ticks - ticks[0])) / float(k @ k)


def line_period_error(period: float, n: int, jitter: float, edge: float) -> float:
    """Return the standard uncertainty of ``line_period``, in grid steps.

    Rounding errors that do not repeat are as random ones of variance 1/12. Where j periods are
    nearly a whole number of steps they beat: a saw-tooth of p turns tilts the line by about
    0.6/(j·n·p), and one that never turns by as much as the outer edges can be off.

    Args:
        period: Period in grid steps.
        n: Number of periods.
        jitter: Variance a period of accumulating noise, in steps squared.
        edge: Variance of an edge's own noise, in steps squared.
    """
    variance = 12 * (1 / 12 + edge) / n**3 + 1.2 * jitter / n
    for j in range(1, _BEATS + 1):
        turns = n * abs(j * period - round(j * period))
        variance += (_TILT / (j * n * max(1.0, turns))) ** 2
    return math.sqrt(variance)


def period_in_step(period: float, n: int) -> float:
    """Return the period of edges that show no beat with the grid over n periods, or 0.

    What was measured cannot tell it from one that is a whole number of steps, or a simple part of
    one, and only that has errors which do not even out.

    Args:
        period: Period of the best line, in grid steps.
        n: Number of periods.
    """
    if n < _BEATEN:
        return 0.0
    for j in range(1, _BEATS + 1):
        if n * abs(j * period - round(j * period)) < _NO_TURN:
            return round(j * period) / j
    return 0.0


def line_misfit(ticks: FloatArray) -> float:
    """Return how far edges lie at least from the best line, end to end, in grid steps.

    An exact wave on a grid stays below 1; what is beyond is noise.

    Args:
        ticks: Edge times of one direction in grid steps, shape (n,) with n >= 3.

    References:
        The spread of the residuals is convex in the slope, and its slope is the distance of the
        two edges that make it: bisection.
    """
    k = np.arange(ticks.size, dtype=np.float64)
    slope = (ticks[-1] - ticks[0]) / k[-1]
    least = float(np.ptp(ticks - slope * k))
    low, high = slope - 2 * least / k[-1], slope + 2 * least / k[-1]
    for _ in range(_HALVINGS):
        slope = (low + high) / 2
        away = ticks - slope * k
        top, bottom = int(np.argmax(away)), int(np.argmin(away))
        least = min(least, float(away[top] - away[bottom]))
        low, high = (slope, high) if top > bottom else (low, slope)
    return least


def most_edge_noise(ticks: FloatArray) -> float:
    """Return how much edges may scatter by themselves about one line, in steps squared.

    Rounding alone leaves residuals of variance 1/12, to about 1/n, and a misfit below 1.

    Args:
        ticks: Edge times of one direction in grid steps, shape (n,) with n >= 3.
    """
    n = ticks.size
    k = np.arange(n) - (n - 1) / 2
    away = ticks - line_period(ticks) * k
    beyond = float(np.var(away)) - 1 / 12 + 1 / n
    unseen = UNSEEN / n
    shown = unseen + max(0.0, line_misfit(ticks) - 1.0)
    return min(shown**2, max(unseen**2, beyond))


def hidden_noise(ticks: FloatArray) -> float:
    """Return what noise adds to the distance of the outer edges, as the grid may hide it, in steps.

    n periods that fit one line show that little noise accumulates, the less the more they are;
    a misfit shows how much there may be.

    Args:
        ticks: Edge times of one direction in grid steps, shape (n + 1,), n >= 2.

    References:
        The factors come from simulated records of accumulating noise between none and two steps
        a period: U of the period holds 93 % at each.
    """
    n = ticks.size - 1
    hidden = _HIDDEN * (1 + _FEW_HIDE / n) / math.sqrt(n)
    return math.hypot(hidden, _SHOWN * max(0.0, line_misfit(ticks) - 1.0))


def rounding_covariance(cycles: FloatArray, variance: FloatArray) -> FloatArray:
    """Return d² - d + 1/6 of the fraction d of ``cycles``, smoothed by noise.

    Args:
        cycles: Distance of two edges in grid steps, shape (n,).
        variance: Variance of that distance in steps squared, shape (n,).

    References:
        cos(kx) and exp(-ak²) by recurrence from k = 1; of weak noise the harmonics beyond are
        kept whole, of strong noise they are gone.
    """
    d = cycles - np.floor(cycles)
    smooth: FloatArray = d * d - d + 1 / 6
    if not variance.any():
        return smooth
    strong = variance > _STRONG
    smooth[strong] = 0.0
    cosine, damping = np.cos(2 * math.pi * d), np.exp(-2 * math.pi**2 * variance)
    harmonic, before = cosine, np.ones(d.size)
    left, ratio, square = damping, damping, damping**2
    for k in range(1, _HARMONICS + 1):
        smooth += harmonic * np.where(strong, left, left - 1) / (math.pi * k) ** 2
        harmonic, before = 2 * cosine * harmonic - before, harmonic
        ratio = ratio * square
        left = left * ratio
    return smooth


def phase_lock(times_s: FloatArray, step_s: float, period_s: float | None) -> float:
    """Return how far edges sit at one phase of the grid: 0 spread evenly, 1 all alike.

    Interpolation itself bends the phases it gives, and noise spreads those of an even beat, so
    edges are locked only as far as both their times and their mean period say so.

    Args:
        times_s: Edge times in seconds, shape (n,).
        step_s: Grid step in seconds.
        period_s: Mean period in seconds, None where unknown.
    """
    n = times_s.size
    if n < 6 or step_s == 0:
        return 1.0
    seen = _alike(times_s / step_s)
    if period_s is None:
        return seen
    even = np.arange(n, dtype=np.float64) * (period_s / step_s)
    return min(seen, _alike(even))


def _alike(cycles: FloatArray) -> float:
    """Return the length of the mean unit vector at these phases, chance taken out."""
    n = cycles.size
    angle = 2 * math.pi * cycles
    square = float(np.mean(np.cos(angle)) ** 2 + np.mean(np.sin(angle)) ** 2)
    return math.sqrt(max(0.0, (square - 1 / n) * n / (n - 1)))
