from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.signal import lfilter

from benchtool.fitting import Fit, Noise, fit_curve, judge_noise
from benchtool.uncertainty import coverage_factor

N, TURNS = 600, 1.4
END, AMPLITUDE = 12.0, 8.0


def remembering(rng: np.random.Generator, n: int, sd: float, length: float) -> np.ndarray:
    """Return Gaussian noise whose correlation falls as e^(-i/length)."""
    kept = math.exp(-1 / length) if length else 0.0
    fresh = rng.normal(0, sd * math.sqrt(1 - kept**2), n)
    fresh[0] = rng.normal(0, sd)
    return lfilter([1.0], [1.0, -kept], fresh)


def fitted(seed: int, length: float, n_blocks: int) -> tuple[Fit, Noise]:
    """Fit one exponential with a common asymptote and time constant to some slopes."""
    rng = np.random.default_rng(seed)
    x = np.tile(np.linspace(0, TURNS, N), n_blocks)
    block = np.repeat(np.arange(n_blocks), N)
    noise = np.concatenate([remembering(rng, N, 0.02, length) for _ in range(n_blocks)])
    y = END - AMPLITUDE * np.exp(-x) + noise

    def curve(b: np.ndarray) -> np.ndarray:
        return b[0] - b[2:][block] * np.exp(-x / b[1])

    start = np.array([11.0, 0.8, *[7.0] * n_blocks])
    # Means of ten: fewer places to compare, no change to what is judged.
    n_bins = N // 10
    few = np.arange(n_blocks * n_bins)

    def binned(b: np.ndarray) -> np.ndarray:
        return curve(b).reshape(-1, 10).mean(axis=1)

    fit = fit_curve(binned, y.reshape(-1, 10).mean(axis=1), start)
    return fit, judge_noise(fit, (few % n_bins).astype(float), few // n_bins)


def plain_deviation(seed: int, length: float) -> float:
    """Return what a fit to all samples says of the time constant, each taken as independent."""
    rng = np.random.default_rng(seed)
    x = np.linspace(0, TURNS, N)
    y = END - AMPLITUDE * np.exp(-x) + remembering(rng, N, 0.02, length)
    fit = fit_curve(lambda b: b[0] - b[1] * np.exp(-x / b[2]), y, np.array([11.0, 7.0, 0.8]))
    return float(fit.deviations[2])


@pytest.mark.parametrize(("length", "n_blocks"), [(0, 2), (60, 2), (60, 8)])
def test_the_judged_uncertainty_is_the_scatter_of_the_fits(length: float, n_blocks: int) -> None:
    away, u = [], []
    for seed in range(30):
        fit, noise = fitted(seed, length, n_blocks)
        away.append(fit.values[1] - 1)
        u.append(math.sqrt(noise.covariance[1, 1]))
    scatter, stated = float(np.sqrt(np.mean(np.square(away)))), float(np.median(u))
    # 30 fits fix their rms to 13 %; a correlation length of a tenth of a slope is itself known to
    # a third from two slopes
    assert 0.6 * scatter < stated < 1.7 * scatter


def test_a_plain_fit_is_ten_times_too_sure_where_the_noise_remembers() -> None:
    away = [fitted(seed, 60, 1)[0].values[1] - 1 for seed in range(30)]
    plain = np.median([plain_deviation(seed, 60) for seed in range(10)])
    assert float(np.sqrt(np.mean(np.square(away)))) > 7 * plain


def test_intervals_cover_where_the_noise_remembers() -> None:
    hits = 0
    for seed in range(60):
        fit, noise = fitted(seed, 60, 3)
        u = math.sqrt(noise.covariance[1, 1])
        hits += abs(fit.values[1] - 1) <= coverage_factor(float(noise.dof[1])) * u
    assert hits >= 53  # of a true 95 %, fewer has a chance of 1 %


def test_white_noise_is_told_from_noise_that_remembers() -> None:
    assert fitted(1, 0, 4)[1].length < 1
    assert fitted(1, 60, 4)[1].length > 2  # six bins in truth
    assert fitted(1, 0, 4)[1].inflation[1] < 1.5 < fitted(1, 60, 4)[1].inflation[1]


def test_parts_that_disagree_widen_the_interval() -> None:
    rng = np.random.default_rng(4)
    x = np.tile(np.linspace(0, 1, 40), 8)
    block = np.repeat(np.arange(8), 40)
    slopes = 2 + rng.normal(0, 0.3, 8)  # the slope itself changes from part to part
    y = slopes[block] * x + rng.normal(0, 0.01, x.size)
    fit = fit_curve(lambda b: b[0] * x, y, np.array([1.0]))
    noise = judge_noise(fit, np.tile(np.arange(40.0), 8), block)
    u = math.sqrt(noise.covariance[0, 0])
    assert u == pytest.approx(float(np.std(slopes, ddof=1)) / math.sqrt(8), rel=0.25)
    assert noise.dof[0] <= 7
