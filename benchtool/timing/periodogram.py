"""The periodogram at uneven times: which frequencies a row of observations follows."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, NDArray

_OVERSAMPLED = 5  # points in the width of a line
_CHUNK = 1 << 17  # sines that are held at a time
_LEAST = 8
_TREND, _MANY = 3, 16  # degree of a trend, and the observations from which it is that high
_ROUNDING = 1e-12  # of the values: what is left then is nothing
_IN_BLOCK = 256  # frequencies that are made from one

ComplexArray = NDArray[np.complex128]


@frozen_record(eq=False)
class Series:
    """Observations at their times.

    Attributes:
        times_s: Shape (n,).
        values: Mean and trend taken off, shape (n,).
        n_free: Degrees of freedom that are left of them.
    """

    times_s: FloatArray
    values: FloatArray
    n_free: int

    @property
    def is_enough(self) -> bool:
        """Whether there are enough of them, and any that differ."""
        return self.values.size >= _LEAST and bool(np.ptp(self.values) > 0)


def make_series(times_s: FloatArray, values: FloatArray) -> Series:
    """Return observations without their mean and their trend, a cubic where they are many.

    What is left of a drift would otherwise show at the mean rate, whose image it is.
    """
    degree = min(_TREND if values.size >= _MANY else 1, max(0, values.size - 1))
    if not values.size:
        return Series(times_s=times_s, values=values, n_free=0)
    x = times_s - times_s.mean()
    powers = np.vander(x / (np.abs(x).max() or 1.0), degree + 1)
    left = values - powers @ np.linalg.lstsq(powers, values, rcond=None)[0]
    if float(np.ptp(left)) < _ROUNDING * float(np.abs(values).max()):
        left = np.zeros(values.size)
    return Series(times_s=times_s, values=left, n_free=values.size - degree - 1)


@frozen_record
class Comb:
    """Evenly spaced frequencies: ``count`` from ``low_hz`` on, ``step_hz`` apart."""

    low_hz: float
    step_hz: float
    count: int

    @property
    def at_hz(self) -> FloatArray:
        """All of them, shape (count,)."""
        grid: FloatArray = self.low_hz + self.step_hz * np.arange(self.count, dtype=np.float64)
        return grid


def make_comb(low_hz: float, high_hz: float, span_s: float) -> Comb:
    """Return frequencies close enough that no line falls between two."""
    step_hz = 1 / (_OVERSAMPLED * span_s)
    return Comb(low_hz=low_hz, step_hz=step_hz, count=max(1, int((high_hz - low_hz) / step_hz) + 1))


def power(series: Series, at_hz: FloatArray) -> FloatArray:
    """Return the share of the variance that a sine of each frequency takes, shape of ``at_hz``.

    References:
        Lomb 1976; Scargle 1982: with 2·omega·tau = arg of Σ e^(2i·omega·t) sine and cosine at
        omega·(t - tau) are orthogonal at any times, so that their shares add up.
    """
    rows = max(1, _CHUNK // max(1, series.times_s.size))
    shares = [
        _shares(series, *_sums(series, _waves(series, at_hz[first : first + rows])))
        for first in range(0, at_hz.size, rows)
    ]
    return np.concatenate(shares)


def power_on(series: Series, comb: Comb) -> FloatArray:
    """Return the same for evenly spaced frequencies, for far less work.

    A wave of the frequency a + b is the wave of a times the wave of b: some hundred of each make
    all, and the sums over the observations are products of matrices.
    """
    n_blocks = -(-comb.count // _IN_BLOCK)
    fine = _waves(series, comb.step_hz * np.arange(_IN_BLOCK, dtype=np.float64))
    found: list[FloatArray] = []
    rows = max(1, _CHUNK // max(1, series.times_s.size))
    for first in range(0, n_blocks, rows):
        blocks = np.arange(first, min(first + rows, n_blocks), dtype=np.float64)
        coarse = _waves(series, comb.low_hz + comb.step_hz * _IN_BLOCK * blocks)
        seen = (coarse * series.values) @ fine.T
        twice = (coarse * coarse) @ (fine * fine).T
        found.append(_shares(series, seen.ravel(), twice.ravel()))
    return np.concatenate(found)[: comb.count]


def _waves(series: Series, at_hz: FloatArray) -> ComplexArray:
    """Return e^(2πi·f·t), a row a frequency."""
    turns = np.outer(at_hz, series.times_s - series.times_s[0])
    waves: ComplexArray = np.exp(2j * math.pi * (turns - np.rint(turns)))
    return waves


def _sums(series: Series, waves: ComplexArray) -> tuple[ComplexArray, ComplexArray]:
    return waves @ series.values, (waves * waves).sum(axis=1)


def _shares(series: Series, seen: ComplexArray, twice: ComplexArray) -> FloatArray:
    """Return the shares from Σ w·y and Σ w², turned so that both parts of w are orthogonal."""
    n = series.values.size
    turned = seen * np.exp(-0.5j * np.angle(twice))
    size = np.abs(twice)
    cosines, sines = (n + size) / 2, np.maximum((n - size) / 2, 1e-9 * n)
    taken = turned.real**2 / cosines + turned.imag**2 / sines
    shares: FloatArray = np.minimum(taken / float(series.values @ series.values), 1.0)
    return shares


def log_chance(share: FloatArray, n_free: int) -> FloatArray:
    """Return ln of the chance that noise alone gives a sine such a share at one frequency.

    References:
        A sine takes two degrees of freedom of noise: P(share > p) = (1 - p)^(n_free/2 - 1), the
        exact form of Scargle's e^(-z); low where a sine is not quite apart from the trend.
    """
    dof = max(1.0, n_free - 2.0)
    with np.errstate(divide="ignore"):
        logs: FloatArray = dof / 2 * np.log1p(-np.minimum(share, 1 - 1e-15))
    return logs


def joint_log_chance(rows: Sequence[FloatArray]) -> FloatArray:
    """Return ln of the chance that independent rows together come so high.

    References:
        Fisher 1925: -2·Σ ln p is chi-square with 2k degrees of freedom, whose tail is
        e^(-q)·Σ q^j/j! for j < k.
    """
    q = -np.sum(rows, axis=0)
    terms = sum(q**j / math.factorial(j) for j in range(len(rows)))
    joint: FloatArray = -q + np.log(terms)
    return joint


def amplitude(series: Series, at_hz: float) -> float:
    """Return the amplitude of the sine of one frequency that fits best."""
    share = float(power(series, np.array([at_hz]))[0])
    return math.sqrt(2 * share * float(series.values @ series.values) / series.values.size)


def without(series: Series, at_hz: float) -> Series:
    """Return the observations without the sine of one frequency."""
    angle = 2 * math.pi * at_hz * (series.times_s - series.times_s[0])
    waves = np.column_stack([np.cos(angle), np.sin(angle)])
    fitted = waves @ np.linalg.lstsq(waves, series.values, rcond=None)[0]
    return Series(
        times_s=series.times_s, values=series.values - fitted, n_free=max(1, series.n_free - 2)
    )
