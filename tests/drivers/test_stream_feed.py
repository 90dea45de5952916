"""What is read beside the program: nothing is lost silently, and what waits is bounded."""

from __future__ import annotations

import os
import threading
import time
from pathlib import Path

import pytest
from stream_lines import interval_set, printed, square_wave, trace_of

from benchtool.errors import NotConnectedError
from benchtool_drivers.streams.feed import Feed
from benchtool_drivers.streams.opening import open_stream
from benchtool_drivers.streams.pipe import PipeTap
from benchtool_drivers.streams.stream import EdgeStream


class Spring:
    """A tap that gives ten bytes as often as it is asked, and then a foreign error."""

    def __init__(self, n: int) -> None:
        self.n_left = n
        self.is_closed = False

    def read(self, timeout_s: float) -> bytes:
        """Return ten bytes."""
        if self.n_left <= 0:
            raise ZeroDivisionError(f"after {timeout_s}")
        self.n_left -= 1
        return b"123456789\n"

    def close(self) -> None:
        """Note that it was closed."""
        self.is_closed = True


def test_what_waits_is_bounded_and_the_gap_is_told() -> None:
    spring = Spring(1000)
    feed = Feed(spring, "spring", most_pending=200)
    time.sleep(0.1)
    assert spring.n_left > 900
    first = feed.take(1.0)
    assert 200 < len(first.data) <= 220
    assert not first.overrun
    assert feed.take(1.0).overrun
    feed.close()
    assert spring.is_closed


def test_an_error_in_the_thread_reaches_whoever_takes_after_all_that_came() -> None:
    feed = Feed(Spring(5), "spring")
    time.sleep(0.05)
    assert len(feed.take(1.0).data) == 50
    with pytest.raises(ZeroDivisionError):
        feed.take(1.0)
    feed.close()


def test_silence_parts_what_is_delivered_and_is_measured() -> None:
    reading, writing = os.pipe()
    feed = Feed(PipeTap(os.fdopen(reading, "rb", buffering=0), "pipe"), "pipe")
    os.write(writing, b"before\n")
    time.sleep(0.3)
    os.write(writing, b"after\n")
    time.sleep(0.05)
    before, after = feed.take(1.0), feed.take(1.0)
    assert (before.data, after.data) == (b"before\n", b"after\n")
    assert 0.15 < after.silent_s <= 0.35  # looks every 0.05 s; never more than there was
    os.close(writing)
    feed.close()


def test_lines_by_a_pipe_are_read_from_the_first_to_the_end() -> None:
    reading, writing = os.pipe()
    pipe = os.fdopen(reading, "rb", buffering=0)
    stream = EdgeStream(Feed(PipeTap(pipe, "pipe"), "pipe"), "pipe", None, joined=False)
    text = printed(square_wave(1000))

    def write() -> None:
        with os.fdopen(writing, "wb") as end:
            end.write(text)

    writer = threading.Thread(target=write)
    writer.start()
    capture = stream.record(until_periods=499)
    assert interval_set(capture) == {(700, True), (300, False)}
    with pytest.raises(NotConnectedError) as raised:
        stream.record(until_periods=1)
    assert raised.value.code == "stream-ended"
    writer.join()
    stream.close()


def test_a_file_of_lines_is_read_and_followed(tmp_path: Path) -> None:
    path = tmp_path / "edges.log"
    lines = printed(square_wave(1000)).splitlines(keepends=True)
    path.write_bytes(b"".join(lines[:500]))
    stream = open_stream(str(path), window_periods=1000)
    first = stream.newest(1.0)
    with path.open("ab") as file:
        file.writelines(lines[500:])
    second = stream.newest(1.0)
    assert first is not None
    assert second is not None
    assert trace_of(first).times_s.size == 498  # two of the lines are the header and an empty one
    assert trace_of(second).times_s.size == 1000
    path.write_bytes(b"")
    with pytest.raises(NotConnectedError) as raised:
        stream.newest(1.0)
    assert raised.value.code == "stream-ended"
    stream.close()
