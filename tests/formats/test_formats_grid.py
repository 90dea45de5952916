"""Grids that values lie on, and the scan of a clock column by itself."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchtool.errors import MalformedCaptureError
from benchtool.formats.clock import ClockScan
from benchtool.formats.grid import code_step, greatest_common_spacing, value_step
from benchtool.formats.steps import examine_steps


@pytest.mark.parametrize(
    ("ticks", "step"),
    [
        ([], 1),
        ([0], 1),
        ([0, 0], 1),
        ([140, 420], 20 // 2),  # two: only a power of ten is no chance
        ([0, 40, 100, 160], 20),
        ([7, 11, 13], 1),
        ([-40, 20, 60], 20),
    ],
)
def test_greatest_common_spacing(ticks: list[int], step: int) -> None:
    assert greatest_common_spacing(np.array(ticks, np.int64)) == step


@pytest.mark.parametrize(
    ("codes", "step"),
    [([3, 3], None), ([12, 240], None), ([12, 13, 240], 1.0), (range(0, 256, 16), 16.0)],
)
def test_code_step(codes: list[int], step: float | None) -> None:
    assert code_step(np.array(codes)) == step


@given(lsb=st.floats(0.012, 0.2), digits=st.integers(3, 5), seed=st.integers(0, 99))
@settings(max_examples=60, derandomize=True)
def test_converter_step_is_found_through_rounding(lsb: float, digits: int, seed: int) -> None:
    codes = np.random.default_rng(seed).integers(-128, 128, 600)
    step = value_step(np.round(codes * lsb, digits), 10.0**-digits)
    assert step is not None
    # each value is off by half a digit at most, over some 250 steps
    assert step == pytest.approx(lsb, abs=10.0**-digits / 100)


def test_full_precision_values_have_no_step() -> None:
    assert value_step(np.random.default_rng(1).normal(0, 1, 500), None) is None


def scan(stamps: np.ndarray, resolution: float, sizes: list[int]) -> ClockScan:
    clock = ClockScan(examine_steps(stamps[:90], resolution), "a.csv")
    for piece in np.split(stamps, np.cumsum(sizes)):
        clock.feed(piece)
    clock.finish()
    return clock


@given(
    seed=st.integers(0, 999),
    n_bad=st.integers(0, 4),
    n_holes=st.integers(0, 3),
    sizes=st.lists(st.integers(0, 60), max_size=12),
)
@settings(max_examples=150, derandomize=True)
def test_scan_does_not_depend_on_how_blocks_are_cut(
    seed: int, n_bad: int, n_holes: int, sizes: list[int]
) -> None:
    rng = np.random.default_rng(seed)
    stamps = np.arange(300.0)
    for hole in rng.integers(20, 280, n_holes):
        stamps[hole:] += rng.integers(3, 30)
    for bad in rng.integers(5, 295, n_bad):
        stamps[bad] = rng.choice([np.nan, stamps[bad - 1], stamps[bad - 1] - 3, 5000.0])
    whole, parts = scan(stamps, 1e-3, []), scan(stamps, 1e-3, sizes)
    assert parts.dropped.tolist() == whole.dropped.tolist()
    assert [(p.first, p.stop, p.first_t) for p in parts.pieces] == [
        (p.first, p.stop, p.first_t) for p in whole.pieces
    ]
    assert parts.is_even() == whole.is_even()


def test_drifting_stamps_are_not_even() -> None:
    index = np.arange(2000.0)
    assert not scan(index + 1e-5 * index**2, 1e-3, []).is_even()
    assert scan(index, 1e-3, []).is_even()


def test_one_kink_in_a_long_record_is_found() -> None:
    stamps = np.arange(20000.0) * 1e-3
    stamps[12345] += 0.4e-3
    assert not scan(stamps, 1e-9, [500] * 39).is_even()


def test_noise_for_time_is_refused() -> None:
    with pytest.raises(MalformedCaptureError) as caught:
        scan(np.random.default_rng(1).uniform(0, 1, 5000), 1e-6, [700] * 7)
    assert caught.value.code == "time-disorder"


@pytest.mark.parametrize("sizes", [[], [150], [50, 50, 50, 50, 50, 50]])
@pytest.mark.parametrize("back", [1, 170])
def test_a_step_that_is_never_caught_up_is_seen_in_any_block(sizes: list[int], back: int) -> None:
    """A row written twice, or a segment that begins again: no later step is too long."""
    stamps = np.arange(300.0)
    stamps[170:] -= back
    clock = scan(stamps, 1e-3, sizes)
    assert clock.dropped.tolist() == ([170] if back == 1 else [])
    assert clock.n_repeated == (1 if back == 1 else 0)
    assert [piece.restarts for piece in clock.pieces] == ([False] if back == 1 else [False, True])
