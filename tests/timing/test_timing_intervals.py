from __future__ import annotations

import numpy as np
import pytest
from timing_waves import Board, edge_times

from benchtool.model.timing import EdgeRun, Edges
from benchtool.timing import find_intervals

HIGH_S, LOW_S = 7e-3, 4e-3
PERIOD_S = HIGH_S + LOW_S


def as_edges(
    times: np.ndarray, *, start_s: float = 0.0, end_s: float | None = None, first_rises: bool = True
) -> Edges:
    rising = np.arange(times.size) % 2 == (0 if first_rises else 1)
    end = float(times[-1]) + 1e-3 if end_s is None else end_s
    run = EdgeRun(first=0, stop=times.size, start_s=start_s, end_s=end, starts_high=not first_rises)
    return Edges(
        times_s=times,
        rising=rising,
        u_s=np.zeros(times.size),
        runs=(run,),
        step_s=1e-6,
        resolved=True,
    )


def steady(n: int = 10) -> np.ndarray:
    return 2e-3 + np.concatenate([[0], np.cumsum(np.tile([HIGH_S, LOW_S], n))])


def dropped(edges: Edges) -> dict[str, int]:
    return {item.reason: item.count for item in find_intervals(edges).dropped}


def test_only_complete_intervals_count_and_the_cut_ones_are_bounds() -> None:
    found = find_intervals(as_edges(steady(), end_s=0.2))
    assert (found.high_s.size, found.low_s.size, found.period_s.size) == (10, 10, 10)
    assert [(cut.kind, cut.where) for cut in found.cut] == [("low", "start"), ("high", "end")]
    assert found.cut[0].at_least_s == pytest.approx(2e-3)
    assert found.cut[1].at_least_s == pytest.approx(0.2 - steady()[-1])
    assert dropped(as_edges(steady())) == {"cut at start": 1, "cut at end": 1}


def test_active_low_takes_the_period_from_falling_edges() -> None:
    found = find_intervals(as_edges(steady()), active="low")
    assert found.period_starts_s[0] == pytest.approx(2e-3 + HIGH_S)
    assert (found.period_s.size, found.other_period_s.size) == (9, 10)
    assert found.cycle_high_s == pytest.approx(np.full(9, HIGH_S))


def test_a_record_without_an_edge_is_one_bound() -> None:
    run = EdgeRun(first=0, stop=0, start_s=1.0, end_s=4.0, starts_high=True)
    none = np.empty(0)
    edges = Edges(
        times_s=none, rising=none.astype(bool), u_s=none, runs=(run,), step_s=1e-3, resolved=False
    )
    found = find_intervals(edges)
    assert [(c.kind, c.where, c.at_least_s) for c in found.cut] == [("high", "both", 3.0)]


def test_the_long_first_high_after_power_up_is_kept_apart() -> None:
    times = steady()
    times[1:] += HIGH_S * (np.log(3) / np.log(2) - 1)
    found = find_intervals(as_edges(times))
    assert found.first_high_s == pytest.approx(HIGH_S * np.log(3) / np.log(2))
    assert (found.high_s.size, found.low_s.size, found.period_s.size) == (9, 10, 9)


def test_a_long_first_high_whose_start_is_cut_is_none() -> None:
    times = steady()[1:]
    times[1:] += 1e-3
    found = find_intervals(as_edges(times, first_rises=False))
    assert found.first_high_s is None


def test_a_glitch_takes_the_interval_it_interrupts_with_it() -> None:
    times = steady()
    at = times[3] + 1.7e-3  # in the low after the second high
    edges = as_edges(np.sort(np.concatenate([times, [at, at + 2e-4]])))
    assert dropped(edges)["glitch"] == 1
    assert dropped(edges)["interrupted interval"] == 1
    found = find_intervals(edges)
    assert found.low_s == pytest.approx(np.full(9, LOW_S))
    assert found.high_s == pytest.approx(np.full(10, HIGH_S))
    assert found.chains == ((0, 1), (1, 9))


def test_bounce_keeps_its_first_edge_and_the_interval() -> None:
    times = steady()
    at = times[4]
    edges = as_edges(np.sort(np.concatenate([times, at + np.array([5e-5, 9e-5, 1.5e-4, 2e-4])])))
    found = find_intervals(edges)
    assert dropped(edges)["bounce"] == 1
    assert found.high_s == pytest.approx(np.full(10, HIGH_S))
    assert found.chains == ((0, 10),)


def test_bounce_on_every_edge_does_not_become_the_rule() -> None:
    times = steady()
    bounce = np.concatenate([times + 5e-5, times + 9e-5])
    found = find_intervals(as_edges(np.sort(np.concatenate([times, bounce])), end_s=0.2))
    assert found.high_s == pytest.approx(np.full(10, HIGH_S))
    assert found.low_s == pytest.approx(np.full(10, LOW_S))


def test_a_long_stop_does_not_make_glitches_of_the_rest() -> None:
    times = steady()
    times[6:] += 40 * PERIOD_S
    found = find_intervals(as_edges(times))
    assert found.low_s == pytest.approx(np.full(9, LOW_S))
    assert found.high_s == pytest.approx(np.full(10, HIGH_S))


@pytest.mark.parametrize("missing", [1, 2])
def test_missing_pulses_are_found_against_the_median(missing: int) -> None:
    times = np.delete(steady(), np.arange(4, 4 + 2 * missing))
    edges = as_edges(times)
    assert dropped(edges)["missing pulse"] == 1
    found = find_intervals(edges)
    assert found.period_s == pytest.approx(np.full(found.period_s.size, PERIOD_S))
    assert "missing-pulses" in [notice.code for notice in found.warnings]


def test_an_outlier_is_left_out_and_counted() -> None:
    times = steady()
    times[7:] += 0.4 * HIGH_S
    edges = as_edges(times)
    assert dropped(edges)["outlier"] == 1


def test_real_jitter_is_kept() -> None:
    rng = np.random.default_rng(1)
    board = Board(period_s=PERIOD_S, duty=HIGH_S / PERIOD_S, wander=0.1)
    found = find_intervals(as_edges(edge_times(board, 2000, rng) + 2e-3))
    assert found.high_s.size >= 1999
    assert found.low_s.size >= 1999


def test_two_ways_of_running_are_no_outliers() -> None:
    times = 2e-3 + np.concatenate([[0], np.cumsum([7e-3, 4e-3] * 6 + [9e-3, 4e-3] * 4)])
    found = find_intervals(as_edges(times))
    assert found.high_s.size == 10
    assert [notice.code for notice in found.warnings] == ["scattered-intervals"]


def test_no_interval_reaches_across_a_gap() -> None:
    times = steady()
    runs = (
        EdgeRun(first=0, stop=8, start_s=0.0, end_s=times[7] + 1e-3, starts_high=False),
        EdgeRun(first=8, stop=21, start_s=times[8] - 1e-3, end_s=0.2, starts_high=False),
    )
    edges = Edges(
        times_s=times,
        rising=np.arange(21) % 2 == 0,
        u_s=np.zeros(21),
        runs=runs,
        step_s=1e-6,
        resolved=True,
    )
    found = find_intervals(edges)
    assert found.low_s.size == 9
    assert found.chains == ((0, 3), (3, 9))
    assert {d.reason: d.count for d in found.dropped}["cut by a gap"] == 2
    assert [notice.code for notice in found.warnings] == ["gaps"]
