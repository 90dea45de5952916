"""The period from all edges of both directions, weighted as their two noises ask for.

The widths of a trace follow each other high, low, high. An oscillator's own noise moves each width
by an independent amount of variance ``s2``; the noise of an edge lengthens one width and shortens
the next, by a variance ``q2``. So widths have the covariance s2·I + q2·K with K the second
difference (2 on the diagonal, -1 beside it), whose eigenvectors are sines with the eigenvalues
2 - 2·cos(πk/(n+1)). In the sine transform of the widths each ordinate is independent, and for a
ratio ρ = s2/q2 the best mean high and low follow in closed form: with ρ large the period is the
distance of the outer edges over their number, with ρ small it is the slope of a line through all
edges. ρ is not known; every ratio counts as far as the ordinates speak for it.
"""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.timing import Intervals
from benchtool.timing.noise import ones_transformed, sine_transform
from benchtool.uncertainty import COVERAGE, normal_cdf, normal_quantile

_LEAST_RATIO = 0.05  # of (π/n)², where the oscillator's noise is too small to matter
_GREATEST_RATIO = 30.0  # where the edges' noise is
_PER_E = 1.2  # ratios in a factor of e
_CAUTION = 0.25  # power of the ratio in what is believed beforehand, for the uncertainty
_ALL_EDGES = 5.0  # weight of the least ratio, for the estimate
_ALL_OSCILLATOR = 30.0  # weight of the greatest ratio, for the uncertainty
_NOISE_KNOWN = 0.6  # standard uncertainty of the logarithm of an edge's variance from the samples
_SINGLE = 256  # ordinates at the low end that are not joined
_WIDENING = 0.03  # breadth of a band of joined ordinates, of where it lies
_RELATIVE_ROUNDING = 1e-12


@frozen_record(eq=False)
class Blend:
    """A period in seconds, what it is worth, and the two noises of the widths.

    Attributes:
        period_s: The estimate.
        u_s: Its standard uncertainty.
        dof: Degrees of freedom of ``u_s``.
        width_s2: Variance of the oscillator's own noise in a width, s².
        edge_s2: Variance of an edge's measured time, s².
    """

    period_s: float
    u_s: float
    dof: float
    width_s2: float
    edge_s2: float


@frozen_record(eq=False)
class _Ordinates:
    """Sums over bands of ordinates of one eigenvalue: squares, and products with high and low."""

    eigenvalue: FloatArray
    count: FloatArray
    square: FloatArray
    with_shape: FloatArray
    shapes: FloatArray


@frozen_record(eq=False)
class _Ratios:
    """One entry a ratio ρ: its likelihood, the period, and its standard uncertainty."""

    log_ratio: FloatArray
    log_likelihood: FloatArray
    period_s: FloatArray
    u_s: FloatArray
    scale_s2: FloatArray


def blend_period(intervals: Intervals, u_edge_s: float = 0.0) -> Blend | None:
    """Return the period from all widths, None where they are exactly alike.

    Args:
        intervals: Intervals of the trace with 4 widths or more.
        u_edge_s: What the noise of the samples gives an edge: edges scatter by no less, so a
            ratio that leaves them less speaks against itself. 0 where it is not known.

    References:
        Restricted likelihood of the ratio (Patterson & Thompson 1971, from memory), the variance
        itself integrated out (Student t). The estimate believes rather in noise of the edges;
        U in noise of the oscillator, which that of the edges can hide. Both are
        measured in tests/benchmarks: best_estimate.py and coverage_of_timing.py.
    """
    rows = widths_in_turn(intervals)
    n = sum(row.size for row, _ in rows)
    means_s = np.array([np.mean(intervals.high_s), np.mean(intervals.low_s)])
    ordinates = _join([_transform(row, high, means_s) for row, high in rows])
    whole_s = float(means_s.sum())
    if not np.sum(ordinates.square) > n * (_RELATIVE_ROUNDING * whole_s) ** 2:
        return None
    ratios = _weigh_ratios(ordinates, n, max(row.size for row, _ in rows))
    log_likelihood = ratios.log_likelihood + _known_noise(ratios, u_edge_s, n)
    even_log = log_likelihood.copy()
    even_log[0] += math.log(_ALL_EDGES)
    even = _shares(even_log)
    cautious_log = log_likelihood + _CAUTION * ratios.log_ratio
    cautious_log[-1] += math.log(_ALL_OSCILLATOR)
    away_s = float(even @ ratios.period_s)
    half_s = _half_width(_shares(cautious_log), ratios.period_s - away_s, ratios.u_s)
    part = 1 / (1 + np.exp(-ratios.log_ratio))
    return Blend(
        period_s=whole_s + away_s,
        u_s=half_s / normal_quantile((1 + COVERAGE) / 2),
        dof=n - 2,
        width_s2=float(even @ (ratios.scale_s2 * part)),
        edge_s2=float(even @ (ratios.scale_s2 * (1 - part))),
    )


def widths_in_turn(intervals: Intervals) -> list[tuple[FloatArray, bool]]:
    """Return the unbroken successions of widths, and whether each begins with a high one."""
    starts_s = np.concatenate([intervals.high_starts_s, intervals.low_starts_s])
    order = np.argsort(starts_s, kind="stable")
    start_s = starts_s[order]
    width_s = np.concatenate([intervals.high_s, intervals.low_s])[order]
    high = order < intervals.high_s.size
    apart_s = np.abs(start_s[1:] - (start_s[:-1] + width_s[:-1]))
    breaks = (high[1:] == high[:-1]) | (apart_s > 1e-3 * width_s[:-1])
    limits = [0, *(np.flatnonzero(breaks) + 1).tolist(), width_s.size]
    return [
        (width_s[start:stop], bool(high[start])) for start, stop in pairwise(limits) if stop > start
    ]


def _transform(width_s: FloatArray, high_first: bool, means_s: FloatArray) -> _Ordinates:
    """Return the ordinates of one succession, the mean widths taken out."""
    n = width_s.size
    is_high = (np.arange(n) % 2 == 0) == high_first
    y = sine_transform(width_s - np.where(is_high, *means_s))
    ones = ones_transformed(n)
    turns = ones[::-1] if high_first else -ones[::-1]  # the transform of 1, -1, 1, ...
    shapes = np.stack([(ones + turns) / 2, (ones - turns) / 2])
    bands = _bands(n)
    count = np.diff([*bands, n]).astype(np.float64)
    eigenvalue = 2 - 2 * np.cos(np.pi * np.arange(1, n + 1) / (n + 1))
    return _Ordinates(
        eigenvalue=np.add.reduceat(eigenvalue, bands) / count,
        count=count,
        square=np.add.reduceat(y**2, bands),
        with_shape=np.add.reduceat(shapes * y, bands, axis=1),
        shapes=np.add.reduceat(shapes[:, None] * shapes[None], bands, axis=2),
    )


def _bands(n: int) -> list[int]:
    """Return where bands of ordinates begin: single ones, then ever wider ones."""
    starts = list(range(min(n, _SINGLE)))
    at = _SINGLE
    while at < n:
        starts.append(at)
        at += int(at * _WIDENING)
    return starts


def _join(parts: list[_Ordinates]) -> _Ordinates:
    return _Ordinates(
        eigenvalue=np.concatenate([part.eigenvalue for part in parts]),
        count=np.concatenate([part.count for part in parts]),
        square=np.concatenate([part.square for part in parts]),
        with_shape=np.concatenate([part.with_shape for part in parts], axis=1),
        shapes=np.concatenate([part.shapes for part in parts], axis=2),
    )


def _weigh_ratios(ordinates: _Ordinates, n: int, longest: int) -> _Ratios:
    """Return the period and the likelihood at each ratio of the two noises."""
    least = math.log(_LEAST_RATIO * (math.pi / longest) ** 2)
    most = math.log(_GREATEST_RATIO)
    log_ratio = np.linspace(least, most, int((most - least) * _PER_E) + 2)
    ratio = np.exp(log_ratio)[:, None]
    weight = (1 + ratio) / (ratio + ordinates.eigenvalue)
    normal = np.moveaxis(ordinates.shapes @ weight.T, -1, 0)
    target = weight @ ordinates.with_shape.T
    inverse = np.linalg.inv(normal)
    means_s = np.einsum("mij,mj->mi", inverse, target)
    square = weight @ ordinates.square - np.einsum("mi,mi->m", target, means_s)
    scale_s2 = np.maximum(square, 0.0) / (n - 2) + 1e-300
    log_likelihood = (
        np.log(weight) @ ordinates.count / 2
        - np.log(np.linalg.det(normal)) / 2
        - (n - 2) / 2 * np.log(scale_s2)
    )
    return _Ratios(
        log_ratio=log_ratio,
        log_likelihood=log_likelihood,
        period_s=means_s.sum(axis=1),
        u_s=np.sqrt(scale_s2 * inverse.sum(axis=(1, 2))),
        scale_s2=scale_s2,
    )


def _known_noise(ratios: _Ratios, u_edge_s: float, n: int) -> FloatArray:
    """Return the log likelihood of edge noise below what is known, for each ratio."""
    if u_edge_s == 0:
        return np.zeros(ratios.log_ratio.size)
    edge_s2 = ratios.scale_s2 / (1 + np.exp(ratios.log_ratio))
    short = np.minimum(0.0, np.log(edge_s2 / u_edge_s**2))
    log_likelihood: FloatArray = -(short**2) / 2 / (_NOISE_KNOWN**2 + 2 / (n - 2))
    return log_likelihood


def _shares(log_weight: FloatArray) -> FloatArray:
    weight = np.exp(log_weight - log_weight.max())
    shares: FloatArray = weight / weight.sum()
    return shares


def _half_width(shares: FloatArray, away_s: FloatArray, u_s: FloatArray) -> float:
    """Return the half-width around zero that holds 95 % of a mixture of normal laws."""
    low, high = 0.0, float(np.max(np.abs(away_s) + 3 * u_s))
    parts = [part for part in zip(shares, away_s, u_s, strict=True) if part[0] > 1e-6]
    for _ in range(40):
        half = (low + high) / 2
        held = math.fsum(
            share * (normal_cdf((half - away) / u) - normal_cdf((-half - away) / u))
            for share, away, u in parts
        )
        low, high = (half, high) if held < COVERAGE else (low, half)
    return high
