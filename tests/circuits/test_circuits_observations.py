"""Which times are used, with what uncertainty, and where the search for the products begins."""

from __future__ import annotations

import math

import pytest
from circuit_boards import make_design, make_stage, timing_of

from benchtool.circuits import TOPOLOGIES, circuit_at, predict
from benchtool.circuits.observations import log_covariance, observe
from benchtool.circuits.starts import start_logs
from benchtool.model.quantity import Contribution, Measured
from benchtool.model.timing import Timing

ASTABLE = TOPOLOGIES["astable"]


def plain(value: float, u: float, unit: str = "s", *, common: bool = False) -> Measured:
    budget = (Contribution(source="timebase" if common else "scatter", u=u, common=common),)
    return Measured(value=value, u=u, unit=unit, budget=budget)


def test_times_made_of_period_and_duty_carry_both_uncertainties():
    timing = Timing(period=plain(10.0, 0.1), duty=plain(0.7, 0.002, "1"))
    high, low = observe(timing, ASTABLE)
    assert (high.name, low.name) == ("t_high", "t_low")
    assert high.measured.value == pytest.approx(7.0)
    assert low.measured.value == pytest.approx(3.0)
    assert high.measured.u == pytest.approx(math.hypot(0.7 * 0.1, 10 * 0.002))
    assert low.measured.u == pytest.approx(math.hypot(0.3 * 0.1, 10 * 0.002))


def test_measured_times_go_before_period_and_duty():
    timing = Timing(
        t_high=plain(7.0, 0.1),
        t_low=plain(3.0, 0.1),
        period=plain(99.0, 0.1),
        duty=plain(0.5, 0.1, "1"),
        first_high=plain(11.0, 0.1),
        delay=plain(5.0, 0.1),
    )
    assert [item.name for item in observe(timing, ASTABLE)] == ["t_high", "t_low", "first_high"]
    assert [item.name for item in observe(timing, ASTABLE, 2)] == ["period"]
    assert [item.name for item in observe(timing, TOPOLOGIES["power-on"])] == ["delay"]
    assert [item.name for item in observe(timing, TOPOLOGIES["one-shot"])] == ["t_high"]


def test_errors_that_times_share_are_correlated_and_scatter_is_not():
    shared = Timing(t_high=plain(7.0, 0.07, common=True), t_low=plain(3.0, 0.06, common=True))
    correlated = log_covariance(observe(shared, ASTABLE)).ravel().tolist()
    assert correlated == pytest.approx([0.01**2, 0.01 * 0.02, 0.01 * 0.02, 0.02**2])
    apart = Timing(t_high=plain(7.0, 0.07), t_low=plain(3.0, 0.06))
    assert log_covariance(observe(apart, ASTABLE)).ravel().tolist() == pytest.approx(
        [1e-4, 0, 0, 4e-4]
    )


def test_the_search_begins_at_the_solution_of_the_ideal_circuit():
    stage = make_stage(family=None)
    design = make_design(stage)
    timing = timing_of(predict(circuit_at(stage, design)), "t_high", "t_low")
    start = start_logs(stage, design, observe(timing, ASTABLE))
    exact = (math.log(100e3 * 47e-6), math.log(330e3 * 47e-6))
    assert start == pytest.approx(exact, abs=1e-9)
