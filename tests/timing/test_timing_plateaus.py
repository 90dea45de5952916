"""Stretches of a state, found in all runs at once, against a plain search run by run."""

from __future__ import annotations

from itertools import groupby

import numpy as np
import pytest

from benchtool.model.arrays import FloatArray
from benchtool.timing import plateaus
from benchtool.timing.plateaus import find_plateau, local_noise, values_beyond, whole_runs


def runs_of(seed: int, n_runs: int, n: int = 400) -> list[FloatArray]:
    """Return runs of noisy samples that change between 0 and 1 at random."""
    rng = np.random.default_rng(seed)
    states = np.cumsum(rng.random(n_runs * n) < 0.05) % 2
    values = states + rng.normal(0, 0.05, states.size)
    return np.split(values, np.sort(rng.choice(np.arange(1, values.size), n_runs - 1)))


def searched(runs: list[FloatArray], most: int) -> list[FloatArray]:
    """Return the stretches above 1/2: the longest of each run, then all by their length."""
    found = []
    for run in runs:
        at = 0
        mine = []
        for above, group in groupby((run > 0.5).tolist()):
            size = len(list(group))
            if above:
                mine.append(run[at : at + size])
            at += size
        found += sorted(mine, key=len, reverse=True)[:most]
    return sorted(found, key=len, reverse=True)


def inner(piece: FloatArray, start: float, end: float) -> FloatArray:
    return piece[int(start * piece.size) : piece.size - int(end * piece.size)]


@pytest.mark.parametrize("n_runs", [1, 2, 64])
def test_the_longest_stretches_of_each_run_are_taken_in_order(n_runs: int) -> None:
    runs = [run for run in runs_of(n_runs, n_runs) if run.size]
    expected = [inner(piece, 0.4, 0.2) for piece in searched(runs, max(8, 1024 // len(runs)))]
    beyond = values_beyond(whole_runs(runs), 0.5, above=True)
    assert np.array_equal(beyond, np.concatenate(expected))


def test_more_stretches_than_are_looked_at_leave_the_shortest_out(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setattr(plateaus, "_MOST", 20)
    runs = runs_of(3, 4)
    expected = [inner(piece, 0.4, 0.2) for piece in searched(runs, 8)[:20]]
    assert np.array_equal(
        values_beyond(whole_runs(runs), 0.5, above=True), np.concatenate(expected)
    )


def test_settling_is_the_mean_difference_between_halves() -> None:
    rise = np.concatenate([np.zeros(40), 1 - 0.2 * np.exp(-np.arange(80) / 40)])
    runs = whole_runs([np.tile(rise, 5)])
    found = find_plateau(runs, 0.9, 0.4)
    settled = inner(rise[40:], 0.6, 0.25)
    half = settled.size // 2
    expected = float(np.mean(settled[half:]) - np.mean(settled[:half]))
    assert found.settling_v == pytest.approx(expected, rel=1e-12)  # arithmetic
    assert np.array_equal(found.settled, np.tile(settled, 5))


def test_noise_is_taken_within_stretches_and_never_over_their_ends() -> None:
    rng = np.random.default_rng(4)
    runs = [level + rng.normal(0, 0.1, 5000) for level in (0.0, 500.0, -500.0)]
    # 15,000 differences fix the trimmed deviation to about 1 %
    assert local_noise(whole_runs(runs)) == pytest.approx(0.1, rel=0.03)
    single = whole_runs([np.array([level]) for level in (0.0, 500.0, -500.0)])
    assert local_noise(single) == 0.0
