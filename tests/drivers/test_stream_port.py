"""Streams over a real pseudo-terminal: what is sent is read, and what goes wrong is named."""

from __future__ import annotations

import os
import socket
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager

import numpy as np
import pytest
from stream_lines import codes_of, interval_set, printed, square_wave, trace_of

from benchtool.errors import InstrumentTimeoutError, NotConnectedError, ReplyError, UsageError
from benchtool.model.capture import Capture
from benchtool_drivers.loopback.edge_printer import (
    DeviceForm,
    Printer,
    StreamFault,
)
from benchtool_drivers.loopback.edge_stream import EdgeDevice
from benchtool_drivers.streams.opening import open_stream
from benchtool_drivers.streams.stream import EdgeStream

TRUE_INTERVALS = {(700, True), (300, False)}


@contextmanager
def connected(
    n_edges: int,
    *faults: StreamFault,
    form: DeviceForm | None = None,
    pace: float | None = None,
    window_periods: int = 100,
    window_s: float | None = None,
) -> Iterator[tuple[EdgeStream, EdgeDevice]]:
    device = EdgeDevice(
        square_wave(n_edges).tolist(),
        Printer(form or DeviceForm(heartbeat_ms=50, header_every=100), faults),
        pace=pace,
        lines_at_once=20 if pace is None else 1,
        wait_for_go=True,
    )
    with device as port:
        stream = open_stream(port, window_periods=window_periods, window_s=window_s)
        try:
            yield stream, device
        finally:
            stream.close()


def newest_after(stream: EdgeStream, n_rows: int) -> Capture | None:
    """Return the capture that follows so many rows, however long a loaded machine is silent."""
    last = None
    end_s = time.monotonic() + 8.0
    while stream.intake.n_rows < n_rows and time.monotonic() < end_s:
        last = stream.newest(1.0) or last
    return last


def all_up_to_the_end(stream: EdgeStream) -> list[Capture]:
    """Return what a stream gives before it says that it is gone."""
    captures = []
    while True:
        try:
            capture = stream.newest(2.0)
        except NotConnectedError:
            return captures
        captures += [capture] if capture is not None else []


def test_a_recording_holds_so_many_periods_and_no_more() -> None:
    told: list[tuple[int, int]] = []
    with connected(3000) as (stream, device):
        device.go()
        capture = stream.record(until_periods=1000, progress=lambda n, of: told.append((n, of)))
    trace = trace_of(capture)
    assert trace.times_s.size == 2001
    assert interval_set(capture) == TRUE_INTERVALS
    assert trace.times_s[0] == 0.0
    assert not capture.warnings
    assert told[-1] == (1000, 1000)


def test_a_recording_by_time_ends_at_that_time() -> None:
    with connected(3000) as (stream, device):
        device.go()
        capture = stream.record(duration_s=0.5)
    assert trace_of(capture).spans[-1].end_s == pytest.approx(0.5, abs=1e-9)  # a whole tick
    assert trace_of(capture).times_s.size == 1001


def test_a_recording_without_a_length_is_refused() -> None:
    with connected(10) as (stream, _), pytest.raises(UsageError):
        stream.record()


def test_the_newest_stretch_is_bounded_and_says_where_it_lies() -> None:
    with connected(2000, window_periods=50) as (stream, device):
        device.go()
        last = newest_after(stream, 2000)
    assert last is not None
    trace = trace_of(last)
    assert trace.times_s.size == 101
    assert last.window is not None
    assert trace.times_s[0] == last.window.from_s > 0.9
    assert interval_set(last) == TRUE_INTERVALS


def test_a_window_in_seconds_keeps_two_periods_at_least() -> None:
    with connected(500, window_s=0.01) as (stream, device):
        device.go()
        last = newest_after(stream, 490)
        assert last is not None
        assert 5 <= trace_of(last).times_s.size <= 21


def test_nothing_new_within_the_time_is_none() -> None:
    with connected(10) as (stream, _):
        start = time.monotonic()
        assert stream.newest(0.1) is None
        assert time.monotonic() - start < 0.4  # a loaded machine may be late


def test_a_signal_at_rest_still_gives_captures_that_grow() -> None:
    with connected(3) as (stream, device):
        device.go()
        ends = []
        for _ in range(3):
            capture = stream.newest(2.0)
            assert capture is not None
            ends.append(trace_of(capture).spans[-1].end_s)
    assert ends == sorted(set(ends))


@pytest.mark.parametrize("kind", ["lost", "garbage", "duplicate", "restart"])
def test_faults_on_the_line_are_noticed_and_no_interval_is_wrong(kind: str) -> None:
    fault = StreamFault(kind=kind, at=50, every=200)  # type: ignore[arg-type]
    with connected(2000, fault) as (stream, device):
        device.go()
        capture = stream.record(until_periods=900)
    expected = "stream-repeated" if kind == "duplicate" else f"stream-{kind}"
    assert expected in codes_of(capture)
    assert interval_set(capture) == TRUE_INTERVALS


def test_unplugging_is_an_error_and_nothing_is_returned() -> None:
    with connected(2000, StreamFault(kind="unplug", at=500)) as (stream, device):
        device.go()
        with pytest.raises(NotConnectedError) as raised:
            stream.record(until_periods=900)
        assert raised.value.step.resource == stream.source
        with pytest.raises(NotConnectedError):
            stream.newest(0.1)


def test_what_came_before_the_unplugging_is_still_given() -> None:
    with connected(2000, StreamFault(kind="unplug", at=500)) as (stream, device):
        device.go()
        captures = all_up_to_the_end(stream)
    assert captures
    assert stream.intake.n_rows == 499


def test_a_stall_with_no_edge_lost_leaves_the_record_whole() -> None:
    stall = StreamFault(kind="stall", at=101, stall_s=0.3)
    with connected(400, stall) as (stream, device):
        device.go()
        capture = stream.record(until_periods=190)
    assert not capture.warnings
    assert len(trace_of(capture).spans) == 1


def test_a_silence_of_more_than_half_a_turn_parts_the_record() -> None:
    form = DeviceForm(tick_bits=16, heartbeat_ms=30, header_every=100)
    stall = StreamFault(kind="stall", at=101, stall_s=0.4)
    with connected(400, stall, form=form) as (stream, device):
        device.go()
        capture = stream.record(until_periods=190)
    assert codes_of(capture) == ["stream-silent"]
    assert len(trace_of(capture).spans) == 2


def test_a_device_that_breaks_its_promise_of_heartbeats_is_reported_dead(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setattr("benchtool_drivers.streams.stream._DEAD_MARGIN_S", 0.2)
    with connected(200, StreamFault(kind="stall", at=101, stall_s=10)) as (stream, device):
        device.go()
        with pytest.raises(InstrumentTimeoutError) as raised:
            stream.record(until_periods=500)
    assert raised.value.code == "no-heartbeat"


def test_lines_without_a_header_are_refused_in_time(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("benchtool_drivers.streams.intake.REPEAT_S", 0.1)
    ours, theirs = os.openpty()
    stream = open_stream(os.ttyname(theirs))
    try:
        os.write(ours, b"1,2,3\n4,5,6\n7,8,9\n")
        with pytest.raises(ReplyError) as raised:
            stream.newest(0.3)
        assert raised.value.code == "stream-no-header"
    finally:
        stream.close()
        os.close(ours)
        os.close(theirs)


def test_a_port_that_is_not_there_says_so() -> None:
    with pytest.raises(NotConnectedError) as raised:
        open_stream("/dev/there-is-no-such-port")
    assert "there is no such port" in raised.value.message


def test_a_scheme_that_is_none_is_a_wrong_option() -> None:
    with pytest.raises(UsageError):
        open_stream("nonsense://somewhere")


def test_a_refused_socket_says_that_nobody_answers() -> None:
    with socket.socket() as closed:
        closed.bind(("127.0.0.1", 0))
        port = closed.getsockname()[1]
    with pytest.raises(NotConnectedError) as raised:
        open_stream(f"socket://127.0.0.1:{port}")
    assert "nobody answers" in raised.value.message


def test_a_socket_gives_all_up_to_its_end_and_is_gone_then() -> None:
    times_s = square_wave(5000)
    text = printed(times_s)
    with socket.create_server(("127.0.0.1", 0)) as server:
        opened = threading.Event()  # the library throws away what comes while it opens

        def send() -> None:
            peer, _ = server.accept()
            with peer:
                opened.wait(2.0)
                peer.sendall(text)

        sender = threading.Thread(target=send)
        sender.start()
        stream = open_stream(f"socket://127.0.0.1:{server.getsockname()[1]}", window_periods=3000)
        opened.set()
        captures = all_up_to_the_end(stream)
        stream.close()
        sender.join()
    np.testing.assert_allclose(
        trace_of(captures[-1]).times_s, times_s - times_s[0], rtol=0, atol=1e-12
    )


@pytest.mark.parametrize(
    ("name", "says"),
    [("/dev/null", "no serial port"), ("socket://bench.invalid:1", "no address is known")],
)
def test_what_is_no_port_says_so(name: str, says: str, monkeypatch: pytest.MonkeyPatch) -> None:
    def unknown(*_: object, **__: object) -> None:
        raise socket.gaierror(socket.EAI_NONAME, "Name or service not known")

    monkeypatch.setattr(socket, "create_connection", unknown)
    with pytest.raises(NotConnectedError, match=says):
        open_stream(name)


def test_an_address_without_a_port_is_a_wrong_option() -> None:
    with pytest.raises(UsageError, match="names no port"):
        open_stream("socket://127.0.0.1")
