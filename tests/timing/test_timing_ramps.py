"""Straight edges placed by all of their samples."""

from __future__ import annotations

import numpy as np
import pytest
from timing_waves import Board, digitise, edge_times, exponential, trapezoid

from benchtool.timing import find_edges
from benchtool.timing.ramps import Ramp, _placed, find_ramp, place_on_ramp

DT_S = 1e-5


def errors_over_bound(rise: float, n: int, captures: int) -> float:
    """Return the rms error of edges over sigma_v/slew/√samples, the Cramér–Rao bound."""
    found = []
    for seed in range(captures):
        rng = np.random.default_rng(seed)
        board = Board(period_s=(30 + 5 * rise + rng.uniform(0, 1)) * DT_S, duty=0.55)
        edges = edge_times(board, n, rng) + 0.3 * board.period_s
        wave = trapezoid(np.arange(0, edges[-1] + (5 + rise) * DT_S, DT_S), edges, rise * DT_S)
        seen = find_edges(digitise(wave, DT_S, bits=12, noise_v=0.02, rng=rng))
        late_s = seen.times_s - edges
        found.append(np.concatenate([late_s[i::2] - np.mean(late_s[i::2]) for i in (0, 1)]))
    bound_s = 0.02 / 4.4 * rise * DT_S / np.sqrt(rise)
    return float(np.std(np.concatenate(found))) / bound_s


@pytest.mark.parametrize("rise", [2.0, 3.0, 5.0, 20.0])
def test_straight_edges_come_near_their_bound(rise: float) -> None:
    # 3,000 edges fix the rms to 1.3 %; the ends of a ramp are left out, 4 % of its samples,
    # and short ones hold one sample less on some edges
    assert errors_over_bound(rise, 30, 50) < 1.10


def test_curved_edges_are_not_taken_for_ramps() -> None:
    x = np.arange(-6, 7) * 1.0
    shift = np.random.default_rng(1).uniform(-0.5, 0.5, 40)
    times = np.broadcast_to(x, (40, x.size))
    since = times - shift[:, None]
    curve = np.where(since > -4, 1 - np.exp(-(since + 4) / 5.77), 0.0) - 0.5  # 0.5 at zero
    assert find_ramp(times, curve, shift, 1.0, 0.002) is None


def test_a_ramp_is_found_and_places_edges_exactly() -> None:
    shift = np.random.default_rng(2).uniform(-0.5, 0.5, 40)
    times = np.broadcast_to(np.arange(-4, 5) * 1.0, (40, 9))
    ramp = np.clip((times - shift[:, None]) / 5, -0.5, 0.5)
    found = find_ramp(times, ramp, shift, 1.0, 1e-6)
    assert found is not None
    assert found.slope == pytest.approx(0.2)
    placed, count = place_on_ramp(times, ramp, shift + 0.05, found)
    assert placed == pytest.approx(shift, abs=1e-12)  # arithmetic
    assert set(count) <= {4.0, 5.0}


def test_too_few_edges_show_no_ramp() -> None:
    times = np.broadcast_to(np.arange(-2, 3) * 1.0, (2, 5))
    assert find_ramp(times, np.clip(times / 3, -0.5, 0.5), np.zeros(2), 1.0, 1e-3) is None


def test_edges_behind_a_slow_filter_keep_their_fit() -> None:
    rng = np.random.default_rng(3)
    board = Board(period_s=2.003e-3, duty=0.5)
    edges = edge_times(board, 20, rng) + 3e-4
    wave = exponential(np.arange(0, edges[-1] + 5e-4, DT_S), edges, 5e-5)
    seen = find_edges(digitise(wave, DT_S, bits=12, noise_v=0.005, rng=rng))
    late_s = seen.times_s - edges - 5e-5 * np.log(2)
    # ln 2 of the time constant late, whatever the phase of the samples, to 2 % of it
    assert np.max(np.abs(late_s[1:-1])) < 1e-6


@pytest.mark.parametrize("n_samples", [4, 6, 7])
def test_edges_placed_all_at_once_are_those_placed_one_by_one(n_samples: int) -> None:
    rng = np.random.default_rng(n_samples)
    shift = rng.uniform(-0.5, 0.5, 500) * DT_S
    times = np.broadcast_to((np.arange(n_samples) - n_samples // 2) * DT_S, (500, n_samples))
    above = np.clip((times - shift[:, None]) / (3 * DT_S), -0.5, 0.5) + rng.normal(
        0, 0.01, times.shape
    )
    rough = shift + rng.normal(0, 0.05, 500) * DT_S
    ramp = Ramp(slope=1 / (3 * DT_S), reach_s=1.44 * DT_S)
    together = place_on_ramp(times, above, rough, ramp)
    alone = _placed(times, above, rough, ramp)
    for one, other in zip(together, alone, strict=True):
        np.testing.assert_array_equal(one, other)  # to the last bit
