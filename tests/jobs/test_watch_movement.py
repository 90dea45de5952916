"""The test for movements: how rarely a still board moves, and how soon a turned one does."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
import pytest

from benchtool.jobs.watch_movement import READINGS_PER_FALSE_ALARM, Course, Scatter, follow

ASSUMED = 1e-3 / 3**0.5
PLAIN = Scatter(assumed_rel=ASSUMED, least_rel=0.0, negligible_rel=0.0)


def moves(readings: Iterable[object], scatter: Scatter = PLAIN) -> list[int]:
    """Return which readings moved, counted from 0."""
    course, found = Course(), []
    for i, reading in enumerate(readings):
        course, moved = follow(course, np.atleast_1d(np.asarray(reading, float)), scatter)
        found += [i] if moved else []
    return found


def still(n: int, *, sd: float = ASSUMED, size: int = 1, seed: int = 1) -> list[np.ndarray]:
    return list(1 + sd * np.random.default_rng(seed).normal(size=(n, size)))


@pytest.mark.parametrize("size", [1, 10])
@pytest.mark.parametrize("sd", [ASSUMED, 3 * ASSUMED])
def test_a_still_board_moves_no_oftener_than_stated(size: int, sd: float) -> None:
    """In 12,000 readings two false alarms are stated; more than eight have a chance of 2e-4."""
    n = 2 * READINGS_PER_FALSE_ALARM
    assert len(moves(still(n, sd=sd, size=size, seed=size))) <= 8


def test_a_jump_is_found_in_the_reading_that_makes_it() -> None:
    assert moves([1.0, 1.0004, 0.9998, 1.02, 1.0203]) == [3]


def test_the_second_reading_can_already_have_moved() -> None:
    assert moves([1.0, 1.05]) == [1]


def test_a_shift_as_small_as_the_noise_is_found_by_the_sum() -> None:
    """Shift of 1.5 sd: a limit of 4 sd on the single reading would miss it for 150 readings."""
    before, after = still(60, seed=4), [1.5 * ASSUMED + x for x in still(60, seed=5)]
    found = moves(before + after)
    assert len(found) >= 1
    assert 60 <= found[0] < 80


def test_both_directions_are_alike() -> None:
    up = [1.0, 1.0002, 0.9999, 1.01]
    assert moves(up) == moves([2 - x for x in up]) == [3]


def test_what_the_timebase_hides_is_no_movement() -> None:
    quiet = Scatter(assumed_rel=1e-8, least_rel=1e-8, negligible_rel=29e-6)
    readings = [1.0] * 5 + [1 + 20e-6] * 5
    assert moves(readings, quiet) == []
    assert moves([1.0] * 5 + [1 + 40e-6] * 5, quiet) == [5]


def test_one_step_of_the_grid_is_no_movement() -> None:
    """Equal readings have no scatter of their own; the grid's stands in for it."""
    grid = Scatter(assumed_rel=0.0, least_rel=1e-3 / 6**0.5, negligible_rel=0.0)
    assert moves([1.0] * 6 + [1.001] + [1.0] * 6, grid) == []


def test_many_intervals_show_a_smaller_change() -> None:
    change = 0.4 * ASSUMED
    few = [*still(6, seed=2), *(x + change for x in still(1, seed=3))]
    many = [*still(6, size=400, seed=2), *(x + change for x in still(1, size=400, seed=3))]
    assert moves(few) == []
    assert moves(many) == [6]


def test_noise_beyond_what_was_assumed_is_learnt() -> None:
    """Readings that scatter 20 times as much seem to move at first, and soon no oftener than all.

    Of 40 boards two have a false alarm among 140 readings each at the rate stated; six or more
    have a chance of 2 %.
    """
    found = [moves(still(200, sd=20 * ASSUMED, seed=seed)) for seed in range(40)]
    assert sum(bool(moved) for moved in found) > 10
    assert max(len(moved) for moved in found) <= 10
    assert sum(any(i > 60 for i in moved) for moved in found) < 6


def test_readings_that_go_back_and_forth_are_noise() -> None:
    """Each moves by 5 % and is alone: after five of them they are averaged."""
    assert moves([1.0, 1.05] * 10) == [1, 2, 3, 4]


def test_a_trimmer_turned_the_same_way_at_each_reading_moves_at_each() -> None:
    readings = [1.0, 1.0003, *(1 + 0.02 * k for k in range(1, 12))]
    assert moves(readings) == list(range(2, 13))
