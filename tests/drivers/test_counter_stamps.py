"""Time stamps of edges: exact, in every form, and edges that were not stamped."""

from __future__ import annotations

import numpy as np
import pytest
from counted_boards import (
    JITTER_REL,
    PERIOD_S,
    STAMPS,
    T_HIGH_S,
    T_LOW_S,
    changed,
    opened,
    stamp_counter,
)
from simulated import TRANSPORTS

from benchtool.errors import ReplyError, UsageError
from benchtool.instruments import Order
from benchtool.model.capture import Capture, LogicTrace
from benchtool.model.quantity import Measured
from benchtool.pipeline import measure
from benchtool_drivers.counter.stamping import both_ways, one_way, with_levels
from benchtool_drivers.loopback.families.counters import StampCounter

LIST = (("TST:DATA?", "TST:LIST?"), ('wrap  = "definite"', 'wrap = "ascii"'), ('"ticks"', '"s"'))
ASKED_FIRST = "first = { query = \"TST:FIRS?\", rising = '(?i)^\\s*POS' }"


def trace_of(capture: Capture) -> LogicTrace:
    trace = capture.traces[0]
    assert isinstance(trace, LogicTrace)
    return trace


def assert_sound(trace: LogicTrace) -> None:
    """States alternate inside each span, and every width is that of its state."""
    for span in trace.spans:
        inside = (trace.times_s >= span.start_s) & (trace.times_s <= span.end_s)
        states, times_s = trace.states[inside], trace.times_s[inside]
        assert states[0] != span.starts_high
        assert np.all(states[1:] != states[:-1])
        due_s = np.where(states[:-1], T_HIGH_S, T_LOW_S)
        assert np.abs(np.diff(times_s) / due_s - 1).max(initial=0.0) < 5 * JITTER_REL


@pytest.mark.parametrize("rises", [True, False])
@pytest.mark.parametrize("transport", TRANSPORTS)
def test_stamps_become_edges_exactly(transport: str, rises: bool) -> None:
    subject = stamp_counter()
    subject.first_rises = rises
    with opened(subject, STAMPS, transport) as counter:
        capture = counter.acquire(Order(readings=41))
    trace, ticks = trace_of(capture), subject.sent[0].astype(np.int64)
    np.testing.assert_array_equal(trace.times_s, (ticks - ticks[0]) * subject.tick_s)
    assert trace.states.tolist() == [(k % 2 == 0) == rises for k in range(41)]
    assert (trace.tick_s, len(trace.spans), capture.warnings) == (subject.tick_s, 1, ())
    assert_sound(trace)


@pytest.mark.parametrize("rises", [True, False])
@pytest.mark.parametrize(("fault", "n_missed"), [("missed_edges", 1), ("missed_pair", 2)])
def test_edges_that_were_skipped_are_a_gap_and_the_states_stay_right(
    fault: str, n_missed: int, rises: bool
) -> None:
    subject = stamp_counter(fault)
    subject.first_rises = rises
    with opened(subject, STAMPS) as counter:
        capture = counter.acquire(Order(readings=40))
    trace = trace_of(capture)
    assert len(trace.spans) == 2
    assert [notice.code for notice in capture.warnings] == ["edges-skipped"]
    assert f"skipped {n_missed} edge" in capture.warnings[0].text
    assert_sound(trace)
    timing = measure(capture).results[0].timing
    assert timing is not None
    assert isinstance(timing.period, Measured)
    # the mean of 18 periods is within five of their own standard deviations over the root of 18
    assert abs(timing.period.value / PERIOD_S - 1) < 5 * JITTER_REL / 18**0.5


@pytest.mark.parametrize("fault", [None, "missed_edges", "missed_pair"])
def test_stamps_may_come_with_levels(fault: str | None) -> None:
    subject = stamp_counter(fault)
    subject.slopes = "levels"
    dialect = changed(STAMPS, *LIST, ('edges = "both"', 'edges = "levels"'), (ASKED_FIRST, ""))
    with opened(subject, dialect) as counter:
        capture = counter.acquire(Order(readings=40))
    trace = trace_of(capture)
    assert trace.times_s.size == 40
    assert len(trace.spans) == (1 if fault is None else 2)
    assert_sound(trace)


@pytest.mark.parametrize("slope", ["rising", "falling"])
@pytest.mark.parametrize("fault", [None, "missed_edges"])
def test_stamps_of_one_direction_are_periods_that_follow_each_other(
    slope: str, fault: str | None
) -> None:
    subject = stamp_counter(fault)
    subject.slopes = slope
    dialect = changed(STAMPS, ('edges = "both"', f'edges = "{slope}"'), (ASKED_FIRST, ""))
    with opened(subject, dialect) as counter:
        assert counter.delivers == "readings"
        counted = counter.count(Order(readings=31))
    item = counted.readings["period"]
    ticks = subject.sent[0].astype(np.int64)
    periods_s = np.diff((ticks - ticks[0]) * subject.tick_s)
    kept = periods_s < 1.5 * PERIOD_S
    np.testing.assert_array_equal(item.values, periods_s[kept])
    assert item.values.size == (30 if fault is None else 29)
    assert len(item.chains) == (1 if fault is None else 2)
    assert item.chains[-1][1] == item.values.size
    assert [notice.code for notice in counted.warnings] == (["edges-skipped"] if fault else [])


def test_a_first_stamp_marked_as_none_does_not_turn_the_states_round() -> None:
    subject = stamp_counter("late_first")
    with opened(subject, changed(STAMPS, *LIST)) as counter:
        capture = counter.acquire(Order(readings=20))
    assert trace_of(capture).times_s.size == 19
    assert not trace_of(capture).states[0]
    assert [notice.code for notice in capture.warnings] == ["readings-missing"]
    assert_sound(trace_of(capture))


def test_stamps_that_go_back_are_refused() -> None:
    with (
        opened(stamp_counter("stands_back"), STAMPS) as counter,
        pytest.raises(ReplyError, match="time stamp 4") as caught,
    ):
        counter.acquire(Order(readings=20))
    assert caught.value.code == "stamps-not-increasing"


def test_more_stamps_than_the_counter_holds_are_refused() -> None:
    with opened(stamp_counter(), STAMPS) as counter, pytest.raises(UsageError) as caught:
        counter.acquire(Order(readings=100_001))
    assert caught.value.code == "too-many-stamps"


def test_what_was_set_is_put_back() -> None:
    subject: StampCounter = stamp_counter()
    subject.n_asked = 7
    with opened(subject, STAMPS) as counter:
        counter.acquire(Order(readings=20))
    assert subject.n_asked == 7


def waves(high_s: float, low_s: float, n: int) -> np.ndarray:
    widths = np.where(np.arange(n - 1) % 2 == 0, high_s, low_s)
    return np.concatenate([[0.0], np.cumsum(widths)])


@pytest.mark.parametrize("duty", [0.1, 0.35, 0.5, 0.65, 0.9])
@pytest.mark.parametrize("gone", [[7], [7, 8], [7, 8, 9], [12, 13, 14, 15], [7, 20], [6, 21, 22]])
def test_any_number_of_missing_edges_is_counted(duty: float, gone: list[int]) -> None:
    whole = waves(duty, 1 - duty, 40)
    rising = np.arange(40) % 2 == 0
    kept = np.delete(np.arange(40), gone)
    for stretch in (
        both_ways(whole[kept], first_rising=True),
        with_levels(whole[kept], rising[kept]),
    ):
        assert stretch.n_missed == len(gone)
        assert stretch.n_left_out == 0
        np.testing.assert_array_equal(stretch.rising, rising[kept])
        bounds = np.flatnonzero(np.diff(kept) > 1) + 1
        assert [piece.start for piece in stretch.pieces] == [0, *bounds]


def test_a_long_first_pulse_is_no_gap() -> None:
    times = waves(0.6, 0.4, 30)
    times[1:] += 0.585 * 0.6  # the first high after power-up, from 0 V: ln 3 / ln 2 of the others
    for stretch in (
        both_ways(times, first_rising=True),
        with_levels(times, np.arange(30) % 2 == 0),
    ):
        found = stretch.n_missed, len(stretch.pieces), stretch.n_left_out
        assert found == (0, 1, 0)


def test_a_first_pulse_as_long_as_a_period_is_not_taken_for_a_skip() -> None:
    times = waves(0.6, 0.4, 30)
    times[1:] += 0.4  # one missing edge would look the same, and turn all states round
    stretch = both_ways(times, first_rising=True)
    assert (stretch.n_missed, stretch.times_s.size, stretch.n_left_out) == (0, 1, 29)


def test_a_pause_of_no_whole_periods_is_no_gap() -> None:
    times = np.arange(20.0)
    times[10:] += 0.5
    assert one_way(times, rising=True).n_missed == 0
    times[10:] += 0.5
    assert one_way(times, rising=True).n_missed == 1


def test_what_cannot_be_told_after_a_skip_is_left_out() -> None:
    # a low time of half a thousandth of the period: one missing edge and two look alike
    whole = waves(0.9995, 0.0005, 40)
    stretch = both_ways(np.delete(whole, 20), first_rising=True)
    assert stretch.n_left_out > 0
    assert stretch.times_s.size + stretch.n_left_out == 39
    np.testing.assert_array_equal(stretch.rising, np.arange(stretch.times_s.size) % 2 == 0)


@pytest.mark.parametrize("n", [1, 2, 3, 4])
def test_a_few_stamps_are_taken_as_they_are(n: int) -> None:
    times = waves(0.6, 0.4, n)
    for stretch in (
        both_ways(times, first_rising=False),
        one_way(times, rising=True),
        with_levels(times, np.arange(n) % 2 == 0),
    ):
        assert (stretch.n_missed, len(stretch.pieces)) == (0, 1)
        assert stretch.pieces[0].stop == n
