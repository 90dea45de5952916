"""A window measures its part of the record as if no other had been recorded."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import pytest

from benchtool.errors import MeasurementError
from benchtool.model.arrays import AnyArray, FloatArray
from benchtool.model.capture import (
    BLOCK,
    ArraySamples,
    Capture,
    LogicTrace,
    Origin,
    Span,
    StampedTime,
    TimeSpan,
    Trace,
    UniformTime,
    Waveform,
)
from benchtool.model.window import Window
from benchtool.timing import find_edges, find_intervals
from benchtool.timing.window import narrow

ORIGIN = Origin(source="mist.csv", format="text", sha256="0" * 64)
DT_S = 1e-3


def capture_of(*traces: Trace) -> Capture:
    return Capture(origin=ORIGIN, traces=traces)


def square(n: int = 10_000) -> FloatArray:
    """A square of 100 samples a period, high in the first 60 of each."""
    return np.where(np.arange(n) % 100 < 60, 12.0, 0.0)


class Watched:
    """Samples that note which of them were asked for."""

    def __init__(self, array: AnyArray) -> None:
        self.inner = ArraySamples(array)
        self.asked: list[tuple[int, int]] = []

    @property
    def size(self) -> int:
        """Number of samples."""
        return self.inner.size

    @property
    def dtype(self) -> np.dtype[np.generic]:
        """Type of a sample."""
        return self.inner.dtype

    def blocks(self, start: int = 0, stop: int | None = None) -> Iterator[AnyArray]:
        """Yield the samples, and note the request."""
        self.asked.append((start, self.size if stop is None else stop))
        yield from self.inner.blocks(start, stop)


def uniform(values: AnyArray | Watched, *spans: Span) -> Waveform:
    samples = values if isinstance(values, Watched) else ArraySamples(values)
    return Waveform(
        samples=samples,
        time=UniformTime(dt_s=DT_S),
        spans=spans or (Span(start=0, stop=samples.size, start_s=0.0),),
        channel="OUT",
    )


def stamped(times_s: FloatArray, values: AnyArray) -> Waveform:
    return Waveform(
        samples=ArraySamples(values),
        time=StampedTime(stamps=ArraySamples(times_s)),
        spans=(Span(start=0, stop=times_s.size, start_s=float(times_s[0])),),
        channel="OUT",
    )


def logic(*spans: TimeSpan) -> LogicTrace:
    """Transitions at 1, 2, 3, ... 9 s, the first rising."""
    return LogicTrace(
        times_s=np.arange(1.0, 10.0),
        states=np.arange(9) % 2 == 0,
        spans=spans or (TimeSpan(start_s=0.0, end_s=10.0, starts_high=False),),
        tick_s=0.1,
        channel="OUT",
    )


def only(capture: Capture) -> Trace:
    assert len(capture.traces) == 1
    return capture.traces[0]


def waveform(capture: Capture) -> Waveform:
    trace = only(capture)
    assert isinstance(trace, Waveform)
    return trace


def values_of(capture: Capture) -> FloatArray:
    return np.concatenate(list(waveform(capture).samples.blocks())).astype(np.float64)


@pytest.mark.parametrize(
    ("from_s", "to_s", "first", "last"),
    [
        (0.25, 0.75, 250, 750),
        (0.2501, 0.7509, 251, 750),
        (0.0, 0.75, 0, 750),
        (9.5, float("inf"), 9500, 9999),
        (9.5, 20.0, 9500, 9999),
        (4.001, 5.0, 4001, 5000),  # 4.001/0.001 lies above 4001 in binary
        (0.0, 0.043, 0, 43),  # 0.043/0.001 lies below 43
    ],
)
def test_both_ends_of_a_window_belong_to_it(
    from_s: float, to_s: float, first: int, last: int
) -> None:
    codes = np.arange(10_000)
    part = narrow(capture_of(uniform(codes)), Window(from_s=from_s, to_s=to_s))
    assert (values_of(part)[0], values_of(part)[-1]) == (first, last)
    assert waveform(part).spans[0].start_s == pytest.approx(first * DT_S)


def test_edges_keep_the_times_of_the_whole_record() -> None:
    whole = capture_of(uniform(square()))
    part = only(narrow(whole, Window(from_s=2.03, to_s=4.04)))
    edges_s = find_edges(whole.traces[0]).times_s
    inside = edges_s[(edges_s > 2.03) & (edges_s < 4.04)]
    assert find_edges(part).times_s == pytest.approx(inside)


def test_an_interval_that_the_window_cuts_is_none() -> None:
    """The window begins inside a high and ends inside a high."""
    part = only(narrow(capture_of(uniform(square())), Window(from_s=2.03, to_s=4.04)))
    found = find_intervals(find_edges(part))
    assert (found.high_s.size, found.low_s.size, found.period_s.size) == (19, 20, 19)
    assert {(cut.kind, cut.where) for cut in found.cut} == {("high", "start"), ("high", "end")}
    assert {drop.reason for drop in found.dropped} == {"cut at start", "cut at end"}


def test_nothing_outside_the_window_is_read() -> None:
    watched = Watched(square(3 * BLOCK))
    window = Window(from_s=BLOCK * DT_S, to_s=(BLOCK + 999) * DT_S)
    part = only(narrow(capture_of(uniform(watched)), window))
    find_intervals(find_edges(part))
    assert watched.asked
    assert min(start for start, _ in watched.asked) == BLOCK
    assert max(stop for _, stop in watched.asked) == BLOCK + 1000


def test_a_window_across_a_hole_keeps_both_pieces() -> None:
    spans = (Span(start=0, stop=500, start_s=0.0), Span(start=500, stop=1000, start_s=2.0))
    whole = capture_of(uniform(np.arange(1000), *spans))
    part = waveform(narrow(whole, Window(from_s=0.4, to_s=2.1)))
    assert [(s.start, s.stop) for s in part.spans] == [(0, 100), (100, 201)]
    assert [s.start_s for s in part.spans] == pytest.approx([0.4, 2.0])


def test_stamped_samples_are_found_by_their_stamps() -> None:
    times_s = np.concatenate([np.arange(0, 1, 0.01), 1 + np.arange(0, 1, 0.02)])
    part = narrow(capture_of(stamped(times_s, np.arange(150))), Window(from_s=0.5, to_s=1.2))
    assert (values_of(part)[0], values_of(part)[-1]) == (50, 110)
    time = waveform(part).time
    assert isinstance(time, StampedTime)
    stamps = np.concatenate(list(time.stamps.blocks()))
    assert (stamps[0], stamps[-1]) == (0.5, 1.2)
    assert waveform(part).spans[0].start_s == 0.5


@pytest.mark.parametrize(
    ("from_s", "to_s", "times", "starts_high"),
    [
        (2.5, 5.5, [3, 4, 5], False),
        (1.5, 4.5, [2, 3, 4], True),
        (2.0, 4.0, [3, 4], False),  # the edge at the limit is the state that the window finds
        (0.0, 2.5, [1, 2], False),
        (8.5, float("inf"), [9], False),
    ],
)
def test_transitions_in_the_window_and_the_state_it_begins_in(
    from_s: float, to_s: float, times: list[float], starts_high: bool
) -> None:
    part = only(narrow(capture_of(logic()), Window(from_s=from_s, to_s=to_s)))
    assert isinstance(part, LogicTrace)
    assert part.times_s.tolist() == times
    assert part.states.tolist() == [t % 2 == 1 for t in times]
    assert part.spans[0].starts_high is starts_high
    assert (part.spans[0].start_s, part.spans[0].end_s) == (from_s, min(to_s, 10.0))


def test_a_transition_that_opens_the_record_stays_in_it() -> None:
    opening = LogicTrace(
        times_s=np.array([0.0, 1.0, 2.0]),
        states=np.array([True, False, True]),
        spans=(TimeSpan(start_s=0.0, end_s=3.0, starts_high=False),),
        tick_s=0.1,
        channel="OUT",
    )
    part = only(narrow(capture_of(opening), Window(from_s=0.0, to_s=2.5)))
    assert isinstance(part, LogicTrace)
    assert part.times_s.tolist() == [0.0, 1.0, 2.0]


def test_the_end_is_known_where_the_window_makes_it() -> None:
    open_ended = LogicTrace(
        times_s=np.arange(1.0, 10.0),
        states=np.arange(9) % 2 == 0,
        spans=(TimeSpan(start_s=0.0, end_s=9.0, starts_high=False),),
        tick_s=0.1,
        channel="OUT",
        end_known=False,
    )
    for to_s, known in ((5.0, True), (20.0, False)):
        part = only(narrow(capture_of(open_ended), Window(from_s=1.5, to_s=to_s)))
        assert isinstance(part, LogicTrace)
        assert part.end_known is known


def test_a_gap_between_transitions_stays_a_gap() -> None:
    gapped = logic(
        TimeSpan(start_s=0.0, end_s=4.5, starts_high=False),
        TimeSpan(start_s=6.5, end_s=10.0, starts_high=False),
    )
    part = only(narrow(capture_of(gapped), Window(from_s=2.5, to_s=8.5)))
    assert isinstance(part, LogicTrace)
    assert [(s.start_s, s.end_s, s.starts_high) for s in part.spans] == [
        (2.5, 4.5, False),
        (6.5, 8.5, False),
    ]


@pytest.mark.parametrize(
    ("trace", "window", "span"),
    [
        (uniform(square()), Window(from_s=20.0), "0 s to 9.999 s"),
        (uniform(square()), Window(from_s=1.0001, to_s=1.0009), "0 s to 9.999 s"),
        (logic(), Window(from_s=11.0, to_s=12.0), "0 s to 10 s"),
        (
            logic(
                TimeSpan(start_s=0.0, end_s=4.5, starts_high=False),
                TimeSpan(start_s=6.5, end_s=10.0, starts_high=False),
            ),
            Window(from_s=5.0, to_s=6.0),
            "0 s to 10 s",
        ),
    ],
    ids=["behind the end", "between two samples", "transitions", "in a gap"],
)
def test_a_window_that_holds_nothing_names_the_record(
    trace: Trace, window: Window, span: str
) -> None:
    with pytest.raises(MeasurementError, match=r"nothing of mist\.csv") as caught:
        narrow(capture_of(trace), window)
    assert caught.value.code == "window-outside"
    assert span in caught.value.hint


def test_a_trace_without_anything_in_the_window_is_left_out_and_said() -> None:
    part = narrow(capture_of(uniform(square()), uniform(square(500))), Window(from_s=5.0))
    assert len(part.traces) == 1
    assert [notice.code for notice in part.warnings] == ["window", "traces-outside-window"]


def test_the_window_is_said_as_it_was_applied() -> None:
    part = narrow(capture_of(uniform(square())), Window(from_s=5.0))
    assert part.window is not None
    assert (part.window.from_s, round(part.window.to_s, 9)) == (5.0, 9.999)
    assert "5 s to 9.999 s of the record" in part.warnings[0].text
    assert part.structure[-1].value == "5 s to 9.999 s"


@pytest.mark.parametrize(("from_s", "to_s"), [(2.0, 2.0), (3.0, 2.0), (-1.0, 2.0)])
def test_a_window_begins_before_it_ends(from_s: float, to_s: float) -> None:
    with pytest.raises(ValueError, match="from < to"):
        Window(from_s=from_s, to_s=to_s)
