from __future__ import annotations

import math

import numpy as np
import pytest
from timing_pulses import HIGH_S, LOW_S, pulses, seen

from benchtool.circuits import Circuit
from benchtool.model.quantity import Measured
from benchtool.model.timing import EdgeRun, Edges
from benchtool.simulation import Acquisition, Ripple, simulate
from benchtool.timing import find_edges, find_intervals
from benchtool.timing.lines import find_lines
from benchtool.timing.regularity import find_jumps, find_lock, find_regularity, find_skips

PERIOD_S = HIGH_S + LOW_S
FAST = Circuit(
    topology="astable", RA=100e3, RB=330e3, C=4.7e-9, supply=12.0, v_upper=8.0, v_lower=4.0
)
FREE_HZ = 1 / ((100e3 + 660e3) * 4.7e-9 * math.log(2))


def rippled(ripple: Ripple, seed: int = 0):  # type: ignore[no-untyped-def]
    acquisition = Acquisition(rate_hz=1e8, duration_s=0.25, kind="logic", ripple=ripple)
    capture, _ = simulate(FAST, acquisition, np.random.default_rng(seed))
    edges = find_edges(capture.traces[0], None)
    return find_intervals(edges), edges


@pytest.mark.parametrize("off_rel", [0.0, 0.005, 0.02])
def test_a_board_that_follows_a_ripple_raises_the_lock_alarm(off_rel: float) -> None:
    """A ripple of 2 % at three times the rate pulls the period, by simulation."""
    ripple_hz = 3 * FREE_HZ * (1 + off_rel)
    intervals, edges = rippled(Ripple(depth_rel=0.02, frequency_hz=ripple_hz))
    supply = Measured(value=ripple_hz, u=1e-5 * ripple_hz, unit="Hz")
    lock = find_lock(intervals, edges, ripple_hz=supply)
    assert lock
    assert lock.cycles == 3
    assert lock.scatter_rel < lock.floor_rel
    assert abs(lock.off.value) < 2 * lock.off.u


def test_a_ripple_that_does_not_lock_raises_none() -> None:
    ripple_hz = 3.1 * FREE_HZ
    intervals, edges = rippled(Ripple(depth_rel=0.002, frequency_hz=ripple_hz))
    supply = Measured(value=ripple_hz, u=1e-5 * ripple_hz, unit="Hz")
    assert find_lock(intervals, edges, ripple_hz=supply) is None


def test_a_free_board_beside_a_multiple_of_the_mains_raises_none() -> None:
    """At 24.7 s every period is a multiple of 10 ms within what the mains is off."""
    rng = np.random.default_rng(0)
    quiet = seen(pulses(60, rng, jitter_rel=1e-6))
    assert find_lock(*quiet) is None
    exact = 0.06 * np.arange(0, 121) / 2
    scattered = exact + rng.normal(0, 3e-5, exact.size)
    assert find_lock(*seen(scattered, 1e-6)) is None  # a multiple of 20 ms, but it scatters


def test_a_lock_to_the_mains_needs_no_supply_trace() -> None:
    times_s = 0.06 * np.arange(0, 121) / 2 + np.random.default_rng(1).normal(0, 1e-6, 121)
    lock = find_lock(*seen(times_s, 1e-7))
    assert lock
    assert (lock.ripple_hz, lock.cycles) in {(50.0, 3), (100.0, 6)}
    assert lock.chance < 0.05


def test_a_missed_edge_keeps_the_phase_and_a_pause_does_not() -> None:
    whole = pulses(40, np.random.default_rng(2), jitter_rel=2e-4)
    missed = np.delete(whole, [30, 31])
    paused = whole + np.where(np.arange(whole.size) > 30, 0.63 * PERIOD_S + PERIOD_S, 0.0)
    (skip,) = find_skips(seen(missed)[1])
    assert skip.kind == "missed"
    assert skip.at_s == pytest.approx(whole[28], abs=1e-3)
    (skip,) = find_skips(seen(paused)[1])
    assert skip.kind == "paused"
    assert skip.shift.value == pytest.approx(0.63 - 1, abs=0.01)


def test_the_phase_test_is_wrong_as_seldom_as_it_says() -> None:
    wrong = 0
    for seed in range(100):
        whole = pulses(30, np.random.default_rng(seed), jitter_rel=2e-3)
        skips = find_skips(seen(np.delete(whole, [20, 21]))[1])
        wrong += [skip.kind for skip in skips] != ["missed"]
    assert wrong <= 3  # beyond three standard uncertainties: 0.3 %, more with few periods


def test_a_pause_under_much_jitter_is_left_unclear() -> None:
    whole = pulses(40, np.random.default_rng(3), jitter_rel=0.15)
    (skip,) = find_skips(seen(np.delete(whole, [30, 31]))[1])
    assert skip.kind == "unclear"


def test_a_board_without_gaps_has_no_skips() -> None:
    assert find_skips(seen(pulses(40, np.random.default_rng(4)))[1]) == ()


def two_level(n: int, rng: np.random.Generator) -> np.ndarray:
    """Return edges whose high time jumps by 2 % now and then, as a worn wiper makes it."""
    bad = np.cumsum(rng.uniform(size=n) < 0.15) % 2 == 1
    high_s = HIGH_S * (1 + 0.02 * bad) * (1 + 3e-4 * rng.normal(size=n))
    low_s = LOW_S * (1 + 3e-4 * rng.normal(size=n))
    lengths_s = np.column_stack([high_s, low_s]).ravel()
    return 1.0 + np.concatenate([[0.0], np.cumsum(lengths_s)])


def test_a_worn_wiper_gives_two_values() -> None:
    jumps = find_jumps(*seen(two_level(60, np.random.default_rng(5))))
    assert jumps
    assert jumps.lower_s == pytest.approx(PERIOD_S, rel=2e-4)
    assert jumps.upper_s == pytest.approx(PERIOD_S + 0.02 * HIGH_S, rel=2e-4)
    assert 2 <= jumps.n_jumps <= 20
    assert jumps.n_lower + jumps.n_upper == 60


@pytest.mark.parametrize("kind", ["jitter", "drift", "ripple", "grid"])
def test_what_has_everything_between_is_no_jump(kind: str) -> None:
    rng = np.random.default_rng(6)
    n, tick_s = 80, 1e-4
    period_s = PERIOD_S * (1 + 1e-4 * rng.normal(size=n))
    if kind == "drift":
        period_s = period_s * (1 + 0.02 * np.linspace(0, 1, n))
    if kind == "ripple":
        period_s = period_s + 0.2 * np.sin(0.7 * np.arange(n))
    if kind == "grid":
        period_s, tick_s = np.full(n, 24.723), 0.05  # between two ticks: two values, the grid's
    lengths_s = np.column_stack([0.565 * period_s, 0.435 * period_s]).ravel()
    times_s = 1.0 + np.concatenate([[0.0], np.cumsum(lengths_s)])
    assert find_jumps(*seen(times_s, tick_s)) is None


def test_all_of_it_in_one_call() -> None:
    found = find_regularity(*seen(two_level(60, np.random.default_rng(5))))
    assert found.jumps
    assert found.lock is None
    assert found.skips == ()


def test_the_beat_of_unresolved_edges_with_their_grid_is_no_ripple() -> None:
    """Edges of a steady wave on a grid swing by 2/pi of its step; nothing follows anything."""
    step_s, high_s, low_s = 1e-5, 3.3127e-3, 3.2571e-3
    starts_s = 0.37e-5 + (high_s + low_s) * np.arange(200)
    exact_s = np.sort(np.concatenate([starts_s, starts_s + high_s]))
    times_s = np.ceil(exact_s / step_s) * step_s
    edges = Edges(
        times_s=times_s,
        rising=np.arange(400) % 2 == 0,
        u_s=np.full(400, 1e-9),
        runs=(
            EdgeRun(
                first=0, stop=400, start_s=0.0, end_s=float(times_s[-1]) + step_s, starts_high=False
            ),
        ),
        step_s=step_s,
        resolved=False,
    )
    assert find_lines(find_intervals(edges), edges)  # the search alone takes the beat for one
    assert find_regularity(find_intervals(edges), edges).lines == ()
