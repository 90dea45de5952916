"""A node that cannot reach its threshold is said so, with figures."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from benchtool.circuits import Circuit, predict

MISTING = Circuit(
    topology="astable", supply=12.0, v_upper=8.0, v_lower=4.0, RA=100e3, RB=330e3, C=47e-6
)
FED = Circuit(topology="output-fed", supply=12.0, v_upper=8.0, v_lower=4.0, R=100e3, C=1e-6)


def test_leak_below_the_upper_threshold():
    times = predict(replace(MISTING, leak_ohm=620e3))
    assert times.stuck.state == "high"
    settles_v = 12 * 620 / (620 + 430)
    assert times.stuck.reason == (
        f"the leak keeps the node at {settles_v:.3g} V, below the upper threshold 8 V"
    )
    assert math.isnan(times.t_high)
    assert math.isnan(times.period)
    assert math.isnan(times.first_high)


def test_leak_that_just_lets_the_node_pass_is_slow_but_not_stuck():
    """430k and 860k divide 12 V to 8 V exactly: on one side it runs, on the other it stands."""
    assert predict(replace(MISTING, leak_ohm=860.01e3)).stuck is None
    assert predict(replace(MISTING, leak_ohm=859.99e3)).stuck is not None


def test_leak_to_the_supply_keeps_it_above_the_lower_threshold():
    times = predict(replace(MISTING, leak_ohm=500e3, leak_to_v=12.0))
    assert times.stuck.state == "low"
    assert "above the lower threshold 4 V" in times.stuck.reason
    assert "leak" in times.stuck.reason
    assert times.first_high > 0  # it does go high once


@pytest.mark.parametrize(
    ("change", "state", "words"),
    [
        ({"i_leak": 20e-6}, "high", "the capacitor's leakage current"),
        ({"i_bias": 20e-6}, "high", "the bias current"),
        ({"probe_r": 500e3}, "high", "the probe"),
        ({"shunt_ohm": 0.5}, "high", "the shunt across the capacitor"),
        ({"i_discharge_leak": 60e-6}, "high", "the leakage of the discharge switch"),
        ({"r_on": 60e3}, "low", "the on-resistance of the discharge switch"),
        ({"v_sat": 4.5}, "low", "the saturation voltage of the discharge switch"),
        ({"v_upper": 13.0}, "high", "the node settles at 12 V"),
    ],
)
def test_the_culprit_is_named(change, state, words):
    stuck = predict(replace(MISTING, **change)).stuck
    assert stuck.state == state
    assert words in stuck.reason


def test_output_that_does_not_swing_far_enough():
    assert "the drop of the high output" in predict(replace(FED, output_high_drop=4.5)).stuck.reason
    assert "the level of the low output" in predict(replace(FED, output_low=4.5)).stuck.reason


def test_single_runs_never_end():
    one_shot = Circuit(topology="one-shot", supply=5.0, v_upper=10 / 3, R=1e6, C=1e-6)
    assert predict(replace(one_shot, i_leak=2e-6)).stuck.state == "high"
    delayed = replace(one_shot, topology="power-on", i_leak=2e-6)
    assert predict(delayed).stuck.state == "low"
    assert math.isnan(predict(delayed).delay)


def test_an_open_resistor_is_told_with_a_voltage_that_can_be():
    stuck = predict(replace(MISTING, RA=1e12, i_discharge_leak=20e-9)).stuck
    assert "the leakage of the discharge switch keeps the node at 0 V" in stuck.reason


def test_rows_of_boards_hold_nan_where_a_board_is_stuck():
    leaks = np.array([math.inf, 860.01e3, 859.99e3, 100e3])
    times = predict(replace(MISTING, leak_ohm=leaks))
    assert np.isnan(times.t_high).tolist() == [False, False, True, True]
    assert np.isnan(times.frequency).tolist() == [False, False, True, True]
    assert times.stuck is None


def test_a_node_that_settles_beyond_its_start_is_not_given_a_negative_time():
    """Where it settles below its start, the logarithm exists and only the direction tells."""
    times = predict(replace(MISTING, leak_ohm=np.array([200e3])))  # settles at 3.8 V
    assert np.isnan(times.t_high).all()


def test_a_node_that_jumps_past_its_threshold_leaves_the_delays_alone():
    """With as much resistance in the capacitor as outside, the node's jump spans the thresholds."""
    jumping = replace(MISTING, RA=1.0, RB=100e3, esr=150e3)
    times = predict(replace(jumping, delay_upper=2e-6, delay_lower=3e-6))
    assert times.t_high == pytest.approx(2e-6, rel=1e-12)
    assert times.t_low == pytest.approx(3e-6, rel=1e-12)
    assert times.stuck is None


def test_a_node_that_settles_exactly_on_its_threshold_never_passes_it():
    assert predict(replace(MISTING, v_upper=12.0)).stuck.state == "high"
