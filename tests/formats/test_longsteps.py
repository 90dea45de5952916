"""Stamps of one digit: long steps that lie evenly are rounding, all others are lost rows."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from read_back import Read, codes_of

from benchtool.formats import longsteps
from benchtool.formats.clock import ClockScan
from benchtool.formats.steps import examine_steps
from benchtool.model.capture import Capture, UniformTime, Waveform


def scan(stamps: np.ndarray, sizes: list[int] | None = None, digit: float = 1.0) -> ClockScan:
    clock = ClockScan(examine_steps(stamps[:90], digit), "a.csv")
    for piece in np.split(stamps, np.cumsum(sizes or [])):
        clock.feed(piece)
    clock.finish()
    return clock


def without(n: int, *lost: int) -> np.ndarray:
    return np.delete(np.arange(float(n)), lost)


def uniform(capture: Capture) -> UniformTime:
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, UniformTime)
    return trace.time


def rows(stamps: np.ndarray, header: str = "t (s),OUT (V)") -> str:
    lines = [f"{int(t)},{12.0 if t % 10 < 6 else 0.0}" for t in stamps.tolist()]
    return "\n".join([header, *lines]) + "\n"


@given(
    step=st.floats(1.002, 1.17),
    phase=st.floats(0, 1),
    n=st.integers(60, 3000),
    digit=st.sampled_from([1.0, 0.1, 1e-3]),
    sizes=st.lists(st.integers(0, 300), max_size=8),
)
@settings(max_examples=200, derandomize=True)
def test_stamps_rounded_from_a_little_more_than_a_digit_stay_even(
    step: float, phase: float, n: int, digit: float, sizes: list[int]
) -> None:
    clock = scan(np.floor(np.arange(n) * step + phase) * digit, sizes, digit)
    assert len(clock.pieces) == 1
    assert clock.is_even()
    # two ends, each rounded by a digit at most
    assert clock.mean_step == pytest.approx(step * digit, abs=digit / (n - 1))


@pytest.mark.parametrize("lost", [(5, 8, 40), (20, 22, 24), (7, 9, 33, 50), (10, 30, 34, 36, 55)])
@pytest.mark.parametrize("sizes", [[], [3] * 15, [4, 1, 20]])
def test_rows_lost_at_random_are_gaps_and_the_interval_is_the_digit(
    lost: tuple[int, ...], sizes: list[int]
) -> None:
    clock = scan(without(60, *lost), sizes)
    kept = [row - i for i, row in enumerate(lost)]
    assert [piece.first for piece in clock.pieces] == [0, *kept]
    assert [piece.first_t for piece in clock.pieces] == [0, *(row + 1 for row in lost)]
    assert clock.mean_step == 1
    assert clock.is_even()


@given(seed=st.integers(0, 10_000), n_lost=st.integers(6, 40))
@settings(max_examples=150, derandomize=True)
def test_many_rows_lost_at_random_are_never_taken_for_rounding(seed: int, n_lost: int) -> None:
    lost = np.random.default_rng(seed).choice(np.arange(1, 599), n_lost, replace=False)
    clock = scan(np.delete(np.arange(600.0), lost))
    assert clock.mean_step == 1
    assert len(clock.pieces) > 1


def test_a_logger_that_comes_a_little_late_keeps_its_odd_interval() -> None:
    late = np.random.default_rng(3).uniform(0, 0.03, 1000)  # never a stamp twice
    clock = scan(np.floor(np.arange(1000) * 1.035 + late))
    assert len(clock.pieces) == 1
    assert clock.mean_step == pytest.approx(1.035, abs=2e-3)


@pytest.mark.parametrize("sizes", [[], [30], [29, 1, 1], [28, 3]])
def test_where_a_row_was_unreadable_a_step_of_two_digits_is_a_gap(sizes: list[int]) -> None:
    stamps = np.arange(60.0)
    stamps[30] = np.nan
    clock = scan(stamps, sizes)
    assert [piece.first for piece in clock.pieces] == [0, 30]
    assert clock.mean_step == 1


def test_two_unreadable_rows_do_not_change_the_interval(read: Read) -> None:
    text = rows(np.arange(60)).replace("\n17,12.0", "\n#!,12.0").replace("\n41,12.0", "\n4x,12.0")
    capture = read(text)
    assert uniform(capture).dt_s == 1
    assert codes_of(capture) == ["gaps", "rows-skipped"]


@pytest.mark.parametrize("lost", [(30,), (17, 41)])
def test_one_or_two_long_steps_are_said_and_the_uncertainty_covers_both(
    read: Read, lost: tuple[int, ...]
) -> None:
    capture = read(rows(without(60, *lost)))
    time = uniform(capture)
    assert codes_of(capture) == ["assumed-even-stamps"]
    assert time.dt_s == pytest.approx(59 / (59 - len(lost)))
    assert 2 * time.u_rel > 1 - 1 / time.dt_s
    # not wider than a rectangle over both readings and the rounding of the ends
    assert time.u_rel < math.hypot(1 - 1 / time.dt_s, math.sqrt(1 / 6) / 59)


def test_a_count_of_rows_is_never_rounded(read: Read) -> None:
    text = rows(without(60, 17, 41), "# Sample interval: 1 ms\nSample,OUT (V)".replace("# ", ""))
    capture = read(text)
    assert codes_of(capture) == ["gaps"]
    assert uniform(capture).dt_s == 1e-3


def test_long_steps_without_end_are_not_held(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(longsteps, "_MOST_NOTED", 5)
    assert scan(np.floor(np.arange(900) * 1.1)).is_even()
    lost = np.arange(300, 380, 2)
    assert not scan(np.delete(np.arange(900.0), lost)).is_even()
