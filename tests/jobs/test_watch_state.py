"""The fold: what is averaged, when it begins anew, where it went."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from moving_boards import (
    RB_OHM,
    edge_times,
    period_s,
    quick_design,
    records,
    relative,
    steps,
    windows,
)

from benchtool.jobs.watch_plan import plan_watch
from benchtool.jobs.watch_sight import View, look_at
from benchtool.jobs.watch_state import WatchState, advance, begin, hinder, mark, unmark
from benchtool.model.capture import ArraySamples, Capture, LogicTrace, TimeSpan, Waveform
from benchtool.model.options import MeasureOptions
from benchtool.model.quantity import Bound, Measured, Notice
from benchtool.model.watch import Reading
from benchtool.observation import settle
from benchtool.pipeline import analyse
from benchtool.uncertainty import expanded

DESIGN = quick_design()


def follow(
    captures: Iterable[Capture],
    *,
    own_axis: bool = True,
    every_s: float = 0.1,
    designed: bool = True,
    **planned: Any,
) -> list[WatchState]:
    """Return the state after each capture."""
    design = DESIGN if designed else None
    settings = settle(MeasureOptions(), design)
    state = begin(plan_watch(settings, design, **planned))
    view = View(settings=settings, design=design, own_axis=own_axis)
    states = []
    for i, capture in enumerate(captures):
        sight, view = look_at(capture, view, i * every_s)
        state = advance(state, sight)
        states.append(state)
    return states


def readings(captures: Iterable[Capture], **given: Any) -> list[Reading]:
    return [state.reading for state in follow(captures, **given)]


def value_of(reading: Reading) -> Measured:
    assert isinstance(reading.value, Measured)
    return reading.value


def test_records_of_a_still_board_are_averaged() -> None:
    found = readings(records([RB_OHM] * 6))
    assert [r.moved for r in found] == [False] * 6
    assert value_of(found[-1]).n > 5 * value_of(found[0]).n
    u = [term.u for r in found for term in value_of(r).budget if term.source == "scatter"]
    assert u[-1] < u[1]


def test_the_average_of_records_covers_the_truth() -> None:
    """Of 40 averages 95 % should; fewer than 34 have a chance of 1 % at that rate."""
    inside = 0
    for seed in range(40):
        value = value_of(readings(records([RB_OHM] * 3, seed=seed, periods=6.5))[-1])
        inside += abs(value.value - period_s()) <= expanded(value)
    assert inside >= 34


def test_a_single_record_reads_as_judge_reads_it() -> None:
    capture = next(records([RB_OHM]))
    result = analyse(capture, DESIGN).results[0]
    found = readings([capture])[-1]
    assert result.timing is not None
    assert found.result is not None
    assert found.result.timing is not None
    for name in ("t_high", "t_low", "period", "frequency", "duty"):
        assert getattr(found.result.timing, name) == getattr(result.timing, name)
    assert found.verdict == result.verdict == "pass"


def test_averaging_begins_anew_at_a_movement() -> None:
    found = readings(records(steps((RB_OHM, 5), (340e3, 3))))
    assert [r.moved for r in found] == [False] * 5 + [True] + [False] * 2
    assert found[5].n_averaged <= 9
    assert relative(value_of(found[-1]).value, period_s(340e3)) < 2e-4  # jitter 2e-4 over √20


def test_the_change_leaves_out_the_timebase_that_both_share() -> None:
    last = readings(records(steps((RB_OHM, 5), (340e3, 5))))[-1]
    assert last.change is not None
    true_s = period_s(340e3) - period_s()
    assert abs(last.change.value - true_s) <= 2 * expanded(last.change)
    timebase = [abs(x.u) for x in last.change.budget if x.source == "timebase"]
    assert timebase == pytest.approx([50e-6 / math.sqrt(3) * last.change.value], rel=1e-9)


@pytest.mark.parametrize(
    ("rbs_ohm", "heading"),
    [
        ([350e3] * 4, "unmoved"),
        (steps((350e3, 4), (340e3, 3)), "towards"),
        (steps((350e3, 4), (360e3, 3)), "away"),
        (steps((350e3, 4), (320e3, 3)), "past"),
        (steps((350e3, 4), (345e3, 1), (340e3, 1), (335e3, 1), (325e3, 3)), "past"),
        (steps((350e3, 4), (327e3, 1), (322e3, 3)), "past"),
        (steps((350e3, 4), (320e3, 1), (322e3, 1), (324e3, 3)), "towards"),
        (steps((350e3, 4), (RB_OHM, 4)), "there"),
    ],
    ids=[
        "unmoved",
        "towards",
        "away",
        "past",
        "past in one go",
        "past and on",
        "back again",
        "there",
    ],
)
def test_the_hint_says_where_the_last_movement_went(rbs_ohm: list[float], heading: str) -> None:
    goal = (period_s(), "s")
    assert readings(records(rbs_ohm), goal=goal)[-1].heading == heading


def test_movements_that_follow_each_other_one_way_are_one() -> None:
    """The change is from before the first of them; after a rest it is from there."""
    found = readings(records(steps((350e3, 4), (345e3, 2), (340e3, 12), (338e3, 2)), periods=4.5))
    changes = [r.change.value for r in found if r.change is not None]
    whole_s, last_s = period_s(340e3) - period_s(350e3), period_s(338e3) - period_s(340e3)
    assert changes[13] == pytest.approx(whole_s, rel=0.02)  # jitter of 2e-4 over some ten periods
    assert changes[-1] == pytest.approx(last_s, rel=0.1)


def test_a_movement_below_its_u_gives_no_direction() -> None:
    """A timebase of 1 % hides a movement of 0.5 %."""
    settings = replace(settle(MeasureOptions(), None), timebase_rel=0.01)
    state = begin(plan_watch(settings, None, goal=(0.030, "s")))
    view = View(settings=settings, own_axis=True)
    for i, capture in enumerate(records(steps((RB_OHM, 4), (333e3, 4)))):
        sight, view = look_at(capture, view, i * 0.1)
        state = advance(state, sight)
    assert state.reading.change is not None
    assert state.reading.heading == "unclear"


def test_overlapping_windows_count_each_interval_once() -> None:
    edges_s = edge_times([0.025] * 100)
    few = readings(windows(edges_s, every_s=1.0, window_s=1.5), own_axis=False)[-1]
    many = readings(windows(edges_s, every_s=0.1, window_s=1.0), own_axis=False)[-1]
    assert few.n_averaged == many.n_averaged == 99  # the first edge lies on the start
    assert value_of(few).value == pytest.approx(value_of(many).value, rel=1e-9)


def test_a_slow_timer_moves_at_its_first_reading() -> None:
    edges_s = edge_times(steps((25.0, 5), (25.5, 4)), jitter_rel=1e-4)
    found = readings(
        windows(edges_s, every_s=25.0, window_s=100.0), own_axis=False, every_s=25.0, designed=False
    )
    moved = [value_of(r).value for r in found if r.moved]
    assert moved == pytest.approx([25.5], rel=1e-3)
    assert found[-1].every_s == pytest.approx(25.0)
    assert found[-1].n_averaged == 4


def test_a_movement_far_from_all_before_is_no_outlier() -> None:
    """One period 40 % longer than ten before it: left out of a capture, but not of a watch."""
    edges_s = edge_times(steps((1.0, 10), (1.4, 2)), jitter_rel=1e-4)
    found = readings(
        windows(edges_s, every_s=1.0, window_s=60.0), own_axis=False, every_s=1.0, designed=False
    )
    assert value_of(found[-1]).value == pytest.approx(1.4, rel=1e-3)


@pytest.mark.parametrize(
    ("quantity", "expected"),
    [
        ("frequency", 1 / 0.025),
        ("t_high", 0.025 * 0.566),
        ("t_low", 0.025 * 0.434),
        ("duty", 0.566),
    ],
)
def test_every_quantity_can_be_watched(quantity: str, expected: float) -> None:
    edges_s = edge_times(steps((0.025, 60), (0.026, 60)), jitter_rel=1e-4)
    found = readings(
        windows(edges_s, every_s=0.3, window_s=0.5),
        own_axis=False,
        designed=False,
        quantity=quantity,
    )
    assert value_of(found[2]).value == pytest.approx(expected, rel=1e-3)
    assert any(r.moved for r in found) is (quantity != "duty")
    assert [p.value for p in found[2].points] == pytest.approx([expected] * 3, rel=1e-3)


def silent(length_s: float, *, high: bool = False) -> Capture:
    """Return a record in which nothing happens."""
    capture = next(windows(np.array([0.5, 1.0]), every_s=1.0, window_s=1.0))
    none = np.empty(0)
    span = TimeSpan(start_s=0.0, end_s=length_s, starts_high=high)
    trace = LogicTrace(
        times_s=none, states=none.astype(bool), spans=(span,), tick_s=1e-6, channel="OUT"
    )
    return replace(capture, traces=(trace,))


def test_a_board_that_stops_has_no_average_any_more() -> None:
    found = readings([*windows(edge_times([0.025] * 40), every_s=0.5, window_s=0.5), silent(1.0)])
    assert found[-1].value == Bound(unit="s", at_least=1.0)
    assert found[-1].verdict == "fail"
    assert found[-1].moved


def test_a_stream_that_goes_quiet_has_no_average_any_more() -> None:
    """Windows go on, since the device sends its heartbeat, but no edge comes."""
    edges_s = np.append(edge_times([0.025] * 20), [2.0])
    found = readings(windows(edges_s, every_s=0.1, window_s=0.3), own_axis=False)
    assert value_of(found[4]).value == pytest.approx(0.025, rel=1e-3)
    stood = found[15]  # at 1.6 s; the last edge was at 0.5 s
    assert isinstance(stood.value, Bound)
    assert stood.value.at_least == pytest.approx(1.1, rel=0.01)
    assert stood.verdict == "fail"


def test_a_record_too_short_for_an_edge_says_nothing() -> None:
    found = readings([*windows(edge_times([0.025] * 40), every_s=0.5, window_s=0.5), silent(0.01)])
    assert found[-1].value == found[-2].value
    assert not found[-1].moved


def test_before_the_first_interval_there_is_a_bound_and_a_verdict() -> None:
    first = readings([silent(0.020)])[0]
    assert first.value == Bound(unit="s", at_least=0.020)
    assert first.came_at_s is not None
    assert first.heading == "unmoved"


def test_a_capture_that_cannot_be_measured_leaves_the_average() -> None:
    good = list(records([RB_OHM] * 2))
    trace = good[0].traces[0]
    assert isinstance(trace, Waveform)
    noise = ArraySamples(np.random.default_rng(1).normal(0, 40, trace.samples.size))
    bad = replace(good[0], traces=(replace(trace, samples=noise),))
    found = readings([good[0], bad, good[1]])
    assert found[1].trouble is not None
    assert found[1].trouble.code == "noise-only"
    assert found[1].value == found[0].value
    assert found[2].trouble is None
    assert value_of(found[2]).value == pytest.approx(period_s(), rel=1e-3)


def test_levels_are_found_anew_each_second() -> None:
    """The board's supply rises to twice as much: its levels are learnt again."""
    captures = list(records([RB_OHM] * 4))
    trace = captures[3].traces[0]
    assert isinstance(trace, Waveform)
    scale = replace(trace.scale, gain=2 * trace.scale.gain, offset=2 * trace.scale.offset)
    captures[3] = replace(captures[3], traces=(replace(trace, scale=scale),))
    results = [r.result for r in readings(captures)]
    high_v = [r.levels.high_v for r in results if r is not None and r.levels is not None]
    assert high_v == pytest.approx([12, 12, 12, 24], rel=0.01)
    assert high_v[0] == high_v[1]


def test_a_file_that_begins_anew_has_an_axis_of_its_own() -> None:
    """Its times start again at 0, before all that was known."""
    first = list(windows(edge_times([0.025] * 40), every_s=0.5, window_s=1.0))
    notice = Notice(code="file-begun-anew", text="it was replaced once")
    again = [
        replace(capture, warnings=(notice,))
        for capture in windows(edge_times([0.026] * 30), every_s=0.2, window_s=1.0)
    ]
    found = readings([*first, *again], own_axis=False)
    assert value_of(found[len(first)]).value == pytest.approx(0.026, rel=1e-3)
    assert found[-1].n_averaged == 29


def test_marks_are_kept_and_taken_back() -> None:
    state = follow(records([RB_OHM] * 2))[-1]
    twice = mark(mark(state))
    assert [m.number for m in twice.reading.marks] == [1, 2]
    assert twice.reading.marks[0].value == state.reading.value
    assert [m.number for m in unmark(twice).reading.marks] == [1]
    assert unmark(unmark(unmark(twice))).reading.marks == ()


def test_nothing_is_marked_before_there_is_a_value() -> None:
    settings = settle(MeasureOptions(), DESIGN)
    assert mark(begin(plan_watch(settings, DESIGN))).reading.marks == ()


def test_a_trigger_that_never_came_is_said_and_forgotten() -> None:
    state = follow(records([RB_OHM]))[-1]
    hindered = hinder(state, Notice(code="no-trigger", text="nothing came"))
    assert hindered.reading.trouble is not None
    assert hindered.reading.value == state.reading.value
