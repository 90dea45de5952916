"""A watch on a counter: readings are averaged since they moved, and no edge is made up for them."""

from __future__ import annotations

import math

import numpy as np
import pytest

from benchtool.jobs.watch_counts import MOST_READINGS, join_counted, readings_of
from benchtool.jobs.watch_sight import View, look_at
from benchtool.jobs.watch_state import WatchState, advance, begin
from benchtool.model.arrays import FloatArray
from benchtool.model.counted import Counted, CountedName, Readings
from benchtool.model.options import MeasureOptions
from benchtool.model.quantity import Measured
from benchtool.model.watch import Goal, WatchedName, WatchPlan
from benchtool.observation import settle

VIEW = View(settings=settle(MeasureOptions(), None), own_axis=True)


def counted(values: FloatArray, name: CountedName = "period") -> Counted:
    return Counted(
        source="COUNTER",
        identity="Invented,Counter,0,1",
        dialect="counter-scpi99",
        channel="1",
        readings={name: Readings(values=values)},
        resolution_s=1e-9,
        sha256="0" * 64,
    )


def plan(quantity: WatchedName = "period", goal: float = 25e-3) -> WatchPlan:
    return WatchPlan(
        quantity=quantity,
        timebase_rel=50e-6,
        jitter_rel=1e-3,
        goal=Goal(value=goal, source="stated"),
    )


def watched(state: WatchState, values: FloatArray, at_s: float) -> WatchState:
    sight, _ = look_at(counted(values), VIEW, at_s)
    return advance(state, sight)


def periods(mean_s: float, seed: int) -> FloatArray:
    return mean_s * (1 + 1e-5 * np.random.default_rng(seed).standard_normal(10))


def test_runs_without_a_movement_are_averaged_together() -> None:
    runs = [periods(24e-3, seed) for seed in range(5)]
    state = begin(plan())
    for k, values in enumerate(runs):
        state = watched(state, values, float(k))
    value = state.reading.value
    assert isinstance(value, Measured)
    assert value.n == 50
    assert value.value == pytest.approx(float(np.mean(runs)), rel=1e-12)


def test_a_movement_begins_the_average_anew_and_says_where_it_went() -> None:
    state = begin(plan())
    for k in range(4):
        state = watched(state, periods(24e-3, k), float(k))
    state = watched(state, periods(24.5e-3, 9), 5.0)
    assert state.reading.moved
    assert state.reading.heading == "towards"
    assert isinstance(state.reading.value, Measured)
    assert state.reading.value.n == 10


def test_the_frequency_follows_from_readings_of_the_period() -> None:
    values = readings_of(counted(np.array([0.02, 0.04])), "frequency")
    np.testing.assert_allclose(values, [50.0, 25.0], rtol=1e-15)


def test_what_the_counter_does_not_count_is_said() -> None:
    state = watched(begin(plan("t_high")), periods(24e-3, 1), 0.0)
    assert state.reading.value is None
    assert state.reading.trouble is not None
    assert state.reading.trouble.code == "not-counted"


def test_the_newest_readings_are_kept() -> None:
    known: Counted | None = None
    for k in range(1 + math.ceil(MOST_READINGS / 1000)):
        known = join_counted(known, counted(np.full(1000, float(k + 1))))
    assert known is not None
    values = known.readings["period"].values
    assert values.size == MOST_READINGS
    assert values[-1] == 1 + math.ceil(MOST_READINGS / 1000)
