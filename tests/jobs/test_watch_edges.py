"""Joining captures: nothing twice, nothing lost, gaps stay gaps."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from moving_boards import START_NS, edge_times, windows

from benchtool.jobs.watch_edges import MOST_EDGES, edges_from, join_edges, newest_edges
from benchtool.model.capture import Capture
from benchtool.model.timing import Edges
from benchtool.timing import find_edges, find_intervals


def edges_of(capture: Capture) -> Edges:
    return find_edges(capture.traces[0])


def offset_s(capture: Capture) -> float:
    assert capture.origin.start_ns is not None
    return (capture.origin.start_ns - START_NS) * 1e-9


def joined(captures: list[Capture]) -> Edges:
    known: Edges | None = None
    for capture in captures:
        known = join_edges(known, edges_of(capture), offset_s(capture))
    assert known is not None
    return known


@pytest.mark.parametrize(("every_s", "window_s"), [(0.3, 1.0), (0.31, 0.5), (0.011, 0.2), (1, 1)])
def test_overlapping_windows_give_each_edge_once(every_s: float, window_s: float) -> None:
    """Window ends that fall between or on edges, many or one new edge at a time."""
    edges_s = edge_times([0.025] * 80)
    found = joined(list(windows(edges_s, every_s=every_s, window_s=window_s)))
    expected = np.round(edges_s, 6)[1:]  # at 0 the first window begins
    assert found.times_s == pytest.approx(expected, abs=1e-9)
    assert len(found.runs) == 1
    assert np.all(found.rising[:-1] != found.rising[1:])


def test_windows_that_leave_something_out_leave_a_gap() -> None:
    captures = list(windows(edge_times([0.025] * 80), every_s=0.3, window_s=0.25))
    found = joined(captures)
    assert len(found.runs) == len(captures) - 1  # the last is shorter, and overlaps
    assert find_intervals(found).period_s == pytest.approx(0.025, rel=2e-3)  # jitter of 2e-4


def test_records_of_their_own_are_never_joined() -> None:
    capture = next(windows(edge_times([0.025] * 20), every_s=0.5, window_s=0.5))
    one = edges_of(capture)
    both = join_edges(join_edges(None, one, None), one, None)
    assert both.times_s.size == 2 * one.times_s.size
    assert len(both.runs) == 2
    assert np.all(np.diff(both.times_s) > 0)
    assert find_intervals(both).period_s.size == 2 * find_intervals(one).period_s.size


def test_another_grid_begins_anew() -> None:
    capture = next(windows(edge_times([0.025] * 20), every_s=0.5, window_s=0.5))
    one = edges_of(capture)
    coarse = replace(one, step_s=10 * one.step_s)
    assert join_edges(one, coarse, None).times_s.size == one.times_s.size


def test_edges_from_a_time_on_begin_with_an_edge() -> None:
    found = joined(list(windows(edge_times([0.025] * 40), every_s=0.3, window_s=0.4)))
    rest = edges_from(found, float(found.times_s[11]))
    assert rest.times_s.tolist() == found.times_s[11:].tolist()
    assert rest.runs[0].start_s == found.times_s[11]
    assert rest.runs[0].starts_high is not bool(rest.rising[0])
    assert rest.runs[-1].stop == rest.times_s.size


def test_only_the_newest_edges_are_kept() -> None:
    found = joined(list(windows(edge_times([0.001] * 6000), every_s=0.5, window_s=0.6)))
    assert found.times_s.size == MOST_EDGES
    assert found.times_s[-1] == pytest.approx(6.0, rel=1e-2)
    assert newest_edges(found, 10).runs[-1].stop == 10
    records = join_edges(found, found, None)
    assert records.times_s.size == MOST_EDGES
    assert records.runs[-1].stop == MOST_EDGES
