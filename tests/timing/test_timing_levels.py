from __future__ import annotations

import numpy as np
import pytest
from timing_waves import HIGH_V, LOW_V, as_waveform, digitise, trapezoid

from benchtool.errors import MeasurementError
from benchtool.model.capture import Scale
from benchtool.timing import find_levels

DT_S = 1e-5
EDGES = np.arange(0.5, 80) * 1e-3


def square(rise_s: float = 1e-6, n: int = 7000) -> np.ndarray:
    return trapezoid(np.arange(n) * DT_S, EDGES, rise_s)


@pytest.mark.parametrize("bits", [6, 8, 12])
def test_state_levels_lie_within_their_uncertainty(bits: int) -> None:
    errors = []
    for seed in range(30):
        rng = np.random.default_rng(seed)
        levels = find_levels(digitise(square(), DT_S, bits=bits, noise_v=0.03, rng=rng))
        assert levels.kind == "two-state"
        errors += [
            (levels.low_v - LOW_V) / levels.u_low_v,
            (levels.high_v - HIGH_V) / levels.u_high_v,
        ]
    # 60 draws of a u that is at least the rms error: the chance of an rms above 1.3 is 1e-4
    assert np.sqrt(np.mean(np.square(errors))) < 1.3


@pytest.mark.parametrize("spike_v", [12.0, 25.0, -8.0])
@pytest.mark.parametrize("n_spikes", [3, 40])
def test_spikes_are_no_state(spike_v: float, n_spikes: int) -> None:
    rng = np.random.default_rng(5)
    volts = 5 * square() + rng.normal(0, 0.02, 7000)
    volts[rng.choice(7000, n_spikes, replace=False)] = spike_v
    levels = find_levels(as_waveform(volts, DT_S))
    assert levels.kind == "two-state"
    assert levels.mid_v == pytest.approx(2.5, abs=0.02)


@pytest.mark.parametrize("width", [1, 2, 5])
def test_the_narrow_pulses_of_a_state_are_no_spikes(width: int) -> None:
    rng = np.random.default_rng(6)
    volts = rng.normal(0, 0.02, 7000)
    for start in range(500, 7000, 1000):
        volts[start : start + width] += 5.0
    levels = find_levels(as_waveform(np.round(volts / 0.04) * 0.04, DT_S))
    assert levels.kind == "two-state"
    assert levels.high_v == pytest.approx(5.0, abs=0.04)


def test_noise_of_a_state_is_found_beside_edges_and_quantisation() -> None:
    rng = np.random.default_rng(1)
    levels = find_levels(digitise(square(), DT_S, bits=12, noise_v=0.03, rng=rng))
    # 4200 differences trimmed at 5 %: relative sd below 2 %
    assert levels.noise_v == pytest.approx(0.03, rel=0.06)


def test_slow_edges_do_not_pull_the_levels() -> None:
    rng = np.random.default_rng(2)
    levels = find_levels(digitise(square(3e-4), DT_S, bits=12, noise_v=0.03, rng=rng))
    assert abs(levels.low_v - LOW_V) < 4 * levels.u_low_v
    assert abs(levels.high_v - HIGH_V) < 4 * levels.u_high_v


def test_ripple_is_no_noise_and_draws_the_references_inwards() -> None:
    rng = np.random.default_rng(3)
    hum = 1 + 0.3 * np.sin(2 * np.pi * 100 * np.arange(7000) * DT_S)
    levels = find_levels(as_waveform(5 * square() * hum + rng.normal(0, 0.01, 7000), DT_S))
    assert levels.kind == "two-state"
    assert levels.noise_v < 0.05
    assert levels.lower_v < levels.mid_v < levels.upper_v < 5 * 0.7 + 0.2


def test_noise_keeps_the_references_of_a_rippling_state_apart() -> None:
    rng = np.random.default_rng(8)
    hum = 1 + 0.3 * np.sin(2 * np.pi * 100 * np.arange(7000) * DT_S)
    levels = find_levels(as_waveform(5 * square() * hum + rng.normal(0, 0.25, 7000), DT_S))
    assert levels.kind == "two-state"
    assert levels.upper_v - levels.lower_v >= 7.9 * levels.noise_v


def test_codes_of_a_negative_gain_read_in_volts() -> None:
    codes = np.round((5 - 5 * square()) / 0.02).astype(np.int16)
    levels = find_levels(as_waveform(codes, DT_S, scale=Scale(gain=-0.02, offset=5.0)))
    assert (levels.low_v, levels.high_v) == pytest.approx((0.0, 5.0), abs=1e-9)


def test_sampled_logic_has_two_states_without_measuring() -> None:
    levels = find_levels(as_waveform((square() > 0.5).astype(np.uint8), DT_S, unit="1"))
    assert (levels.kind, levels.low_v, levels.high_v) == ("two-state", 0.0, 1.0)


@pytest.mark.parametrize(
    ("samples", "kind"),
    [
        (np.full(500, 5.0), "flat"),
        (5 + np.random.default_rng(4).normal(0, 0.03, 5000), "flat"),
        (0.02 * np.random.default_rng(5).integers(0, 2, 5000), "flat"),
        (np.random.default_rng(6).normal(0, 1, 5000), "noise"),
        (np.sin(np.arange(5000) / 100), "noise"),
    ],
    ids=["constant", "noisy DC", "one code toggling", "white noise", "hum"],
)
def test_traces_without_two_states_are_told(samples: np.ndarray, kind: str) -> None:
    assert find_levels(as_waveform(samples, DT_S)).kind == kind


def test_a_state_that_is_seldom_visited_is_not_missed() -> None:
    """The histogram keeps a part of a long record; the extremes come from all of it."""
    samples = np.zeros(3_000_000, np.int8)
    samples[1_234_567:1_234_580] = 100
    levels = find_levels(as_waveform(samples, 1e-6, scale=Scale(gain=0.05)))
    assert (levels.kind, levels.high_v) == ("two-state", pytest.approx(5.0))


def test_missing_samples_are_counted() -> None:
    volts = 5 * square()
    volts[10:15] = np.nan
    levels = find_levels(as_waveform(volts, DT_S))
    assert [notice.code for notice in levels.warnings] == ["missing-samples"]
    assert levels.high_v == pytest.approx(5.0)


def test_a_clipped_state_is_told() -> None:
    rng = np.random.default_rng(7)
    codes = np.clip(300 * square() - 150 + rng.normal(0, 5, 7000), -128, 127).astype(np.int8)
    levels = find_levels(as_waveform(codes, DT_S, scale=Scale(gain=0.02)))
    assert levels.clipped
    assert [notice.code for notice in levels.warnings] == ["clipped"]


def test_the_user_sets_the_mid_level() -> None:
    levels = find_levels(as_waveform(5 * square(3e-5), DT_S), level_v=1.4)
    assert levels.mid_v == 1.4
    assert levels.low_v < levels.lower_v < 1.4 < levels.upper_v < levels.high_v


def test_a_level_outside_the_states_is_refused() -> None:
    with pytest.raises(MeasurementError, match=r"7 V does not lie between") as caught:
        find_levels(as_waveform(5 * square(), DT_S), level_v=7.0)
    assert caught.value.code == "level-outside"


def test_a_trace_of_nothing_but_holes_is_refused() -> None:
    with pytest.raises(MeasurementError) as caught:
        find_levels(as_waveform(np.full(100, np.nan), DT_S))
    assert caught.value.code == "no-samples"
