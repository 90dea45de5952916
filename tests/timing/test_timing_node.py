from __future__ import annotations

import math

import numpy as np
import pytest
from timing_waves import as_waveform

from benchtool.model.quantity import Measured
from benchtool.timing import find_intervals, find_levels, find_turning_points, measure_timing
from benchtool.uncertainty import expanded

SUPPLY_V = 12.0
TAU_CHARGE_S, TAU_DISCHARGE_S = 430e-6, 330e-6
HIGH_S, LOW_S = TAU_CHARGE_S * math.log(2), TAU_DISCHARGE_S * math.log(2)


def astable_node(times: np.ndarray) -> np.ndarray:
    """Return the node of an astable: exponentials between a third and two thirds."""
    phase = times % (HIGH_S + LOW_S)
    up = SUPPLY_V - SUPPLY_V * 2 / 3 * np.exp(-phase / TAU_CHARGE_S)
    down = SUPPLY_V * 2 / 3 * np.exp(-(phase - HIGH_S) / TAU_DISCHARGE_S)
    return np.where(phase < HIGH_S, up, down)


@pytest.mark.parametrize(
    ("dt_s", "noise_v"), [(1e-6, 0.02), (1e-6, 0.1), (2e-7, 0.1), (1e-5, 0.02)]
)
def test_turning_points_give_the_times_of_an_astable(dt_s: float, noise_v: float) -> None:
    ratios = []
    for seed in range(12):
        rng = np.random.default_rng(seed)
        times = rng.uniform(0, 5e-4) + np.arange(0, 6e-3, dt_s)
        trace = as_waveform(astable_node(times) + rng.normal(0, noise_v, times.size), dt_s)
        levels = find_levels(trace)
        assert levels.kind == "node"
        edges = find_turning_points(trace, levels)
        timing = measure_timing(find_intervals(edges), edges, timebase_rel=0.0)
        for quantity, truth in ((timing.t_high, HIGH_S), (timing.t_low, LOW_S)):
            assert isinstance(quantity, Measured)
            ratios.append(abs(quantity.value - truth) / expanded(quantity))
    # 24 figures at 95 %: more than 5 outside has a chance of 0.1 %
    assert sum(ratio > 1 for ratio in ratios) <= 5
    assert expanded(timing.t_high) < 2e-2 * HIGH_S  # type: ignore[arg-type]


def test_the_stated_noise_of_a_turn_is_its_scatter() -> None:
    rng = np.random.default_rng(1)
    times = np.arange(0, 0.05, 1e-6)
    trace = as_waveform(astable_node(times) + rng.normal(0, 0.05, times.size), 1e-6)
    edges = find_turning_points(trace, find_levels(trace))
    troughs = np.arange(100) * (HIGH_S + LOW_S)
    truth = np.ravel(np.column_stack([troughs, troughs + HIGH_S]))
    nearest = truth[np.argmin(np.abs(edges.times_s[:, None] - truth), axis=1)]
    # 190 turns fix the rms to 5 %; the formula for a polynomial's end is good to a fifth
    assert np.std(edges.times_s - nearest) == pytest.approx(np.sqrt(np.mean(edges.u_s**2)), rel=0.3)


def test_a_one_shot_node_rests_and_falls_fast() -> None:
    tau_s, wait_s = 1e-3, 0.4e-3
    width_s = tau_s * math.log(3)
    rng = np.random.default_rng(2)
    times = np.arange(0, 12e-3, 1e-6) + 0.7e-3
    phase = times % (width_s + wait_s)
    ramp, fall = 5 - 5 * np.exp(-phase / tau_s), 10 / 3 * np.exp(-(phase - width_s) / 2e-6)
    volts = np.where(phase < width_s, ramp, fall) + rng.normal(0, 0.01, times.size)
    trace = as_waveform(volts, 1e-6)
    edges = find_turning_points(trace, find_levels(trace))
    timing = measure_timing(find_intervals(edges), edges, timebase_rel=0.0)
    assert isinstance(timing.t_high, Measured)
    assert timing.t_high.value == pytest.approx(width_s, abs=2 * expanded(timing.t_high))
    assert expanded(timing.t_high) < 2e-6


def test_the_cut_turns_at_the_ends_are_left_out() -> None:
    times = np.arange(0, 2.2e-3, 1e-6) + 0.5 * HIGH_S
    trace = as_waveform(astable_node(times), 1e-6)
    edges = find_turning_points(trace, find_levels(trace))
    assert not edges.rising[0]
    assert edges.runs[0].starts_high
    assert edges.times_s[0] == pytest.approx(0.5 * HIGH_S, abs=2e-6)


def test_a_trace_without_a_swing_has_no_turns() -> None:
    trace = as_waveform(np.full(100, 5.0), 1e-6)
    assert find_turning_points(trace, find_levels(trace)).times_s.size == 0
