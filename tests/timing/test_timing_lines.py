from __future__ import annotations

import math

import numpy as np
import pytest
from timing_pulses import pulses, seen

from benchtool.model.quantity import Measured
from benchtool.timing import lines
from benchtool.timing.lines import find_lines
from benchtool.timing.periodogram import (
    joint_log_chance,
    log_chance,
    make_comb,
    make_series,
    power,
    power_on,
)
from benchtool.uncertainty import expanded


def row(n: int, rng: np.random.Generator) -> np.ndarray:
    return np.sort(rng.uniform(0, 100, n))


def test_the_power_is_that_of_a_least_squares_sine() -> None:
    """Lomb's form against a plain linear fit at the same uneven times."""
    rng = np.random.default_rng(0)
    series = make_series(row(60, rng), rng.normal(0, 1, 60))
    for hz in (0.013, 0.4, 2.7, 31.0):
        angle = 2 * math.pi * hz * series.times_s
        waves = np.column_stack([np.cos(angle), np.sin(angle)])
        fitted = waves @ np.linalg.lstsq(waves, series.values, rcond=None)[0]
        share = float(fitted @ fitted) / float(series.values @ series.values)
        assert power(series, np.array([hz]))[0] == pytest.approx(share, rel=1e-9)


def test_the_quick_way_gives_the_same_power() -> None:
    rng = np.random.default_rng(1)
    series = make_series(row(40, rng), rng.normal(0, 1, 40))
    comb = make_comb(3.0, 12.0, 100.0)
    assert comb.count > 4000
    assert power_on(series, comb) == pytest.approx(power(series, comb.at_hz), abs=1e-9)


def test_the_chance_at_one_frequency_is_that_of_noise() -> None:
    rng = np.random.default_rng(2)
    logs = []
    for _ in range(4000):
        series = make_series(row(60, rng), rng.normal(0, 1, 60))
        logs.append(log_chance(power(series, np.array([0.37])), series.n_free)[0])
    for chance in (0.5, 0.1, 0.01):
        # three standard deviations of a share of 4000; the trend takes a little of the sine
        slack = 3 * math.sqrt(chance / 4000)
        assert 0.8 * chance - slack < np.mean(np.array(logs) < math.log(chance)) < chance + slack


def test_chances_of_two_rows_are_joined_as_fisher_does() -> None:
    rng = np.random.default_rng(3)
    logs = np.log(rng.uniform(0, 1, (2, 20_000)))
    joint = joint_log_chance(list(logs))
    for chance in (0.5, 0.05):
        assert np.mean(joint < math.log(chance)) == pytest.approx(chance, rel=0.06)


@pytest.mark.parametrize("ripple_hz", [50.0, 100.0, 120.0])
def test_the_mains_is_seen_far_above_the_rate_of_the_edges(ripple_hz: float) -> None:
    """A period of 24.7 s and a ripple of 100 Hz: 2,500 cycles in each.

    The board warms up by 5 %, so that its edges are uneven by more than half a period: no alias.
    """
    rng = np.random.default_rng(4)
    times_s = pulses(
        100, rng, jitter_rel=5e-5, ripple_hz=ripple_hz, ripple_s=1.2e-3, drift_rel=0.05
    )
    (line,) = find_lines(*seen(times_s))
    assert abs(line.frequency.value - ripple_hz) < 1.5 * expanded(line.frequency)
    assert line.frequency.u < 1e-4 * ripple_hz
    assert line.source == "mains"
    assert line.of_hz == (60.0 if ripple_hz == 120 else 50.0)
    assert line.false_alarm < 1e-6
    assert line.amplitude_s == pytest.approx(1.2e-3, rel=0.35)
    assert not line.others_hz


def test_without_a_ripple_there_is_no_line() -> None:
    found = 0
    for seed in range(15):
        found += len(find_lines(*seen(pulses(30, np.random.default_rng(seed)))))
    assert not found  # false alarms are one in a thousand


def test_the_false_alarm_is_no_smaller_than_it_happens(monkeypatch: pytest.MonkeyPatch) -> None:
    """Of records without a ripple, a tenth may have a best line with a false alarm below 0.1."""
    monkeypatch.setattr(lines, "CHANCE", 2.0)  # so that all are told
    alarms = []
    for seed in range(30):
        times_s = pulses(20, np.random.default_rng(1000 + seed), scale=1e-3)
        alarms.append(find_lines(*seen(times_s, 1e-8))[0].false_alarm)
    assert np.mean(np.array(alarms) < 0.1) < 0.27  # 0.1 and three standard deviations of 30


def test_even_edges_say_that_they_cannot_tell() -> None:
    """Without jitter a frequency and its images about the rate look alike: all are counted."""
    rng = np.random.default_rng(6)
    times_s = pulses(80, rng, jitter_rel=1e-6, ripple_hz=37.0, ripple_s=3e-6, scale=1e-4)
    line = find_lines(*seen(times_s, 1e-9))[0]
    rate_hz = 1e4 / 24.72
    assert line.n_others > 10
    folded = abs(line.frequency.value - rate_hz * round(line.frequency.value / rate_hz))
    assert folded == pytest.approx(37.0, abs=0.2)


def test_a_recorded_supply_settles_which_of_them_it_is() -> None:
    rng = np.random.default_rng(6)
    times_s = pulses(80, rng, jitter_rel=1e-6, ripple_hz=1233.0, ripple_s=3e-6, scale=1e-4)
    ripple = Measured(value=1233.0, u=0.05, unit="Hz")
    line = find_lines(*seen(times_s, 1e-9), ripple_hz=ripple)[0]
    assert line.source == "supply"
    assert line.frequency.value == pytest.approx(1233.0, abs=0.3)


def test_a_handful_of_edges_gives_no_line() -> None:
    assert find_lines(*seen(pulses(5, np.random.default_rng(0)))) == ()


def test_a_series_that_does_not_move_has_no_line() -> None:
    still = make_series(np.arange(20.0), np.full(20, 3.0))
    assert not still.is_enough
