"""The traps of the libraries that the link goes round: one that was mended upstream fails here.

Nothing is wrong with benchtool when one of these fails: the library behaves better than it did,
and what the link does about it can be looked at again. Seen with pyvisa 1.16, pyvisa-py 0.8,
pyserial 3.5.
"""

from __future__ import annotations

import select
import signal
import socket
import time
from collections.abc import Iterator
from contextlib import contextmanager
from types import FrameType
from typing import Any

import pytest
import pyvisa
from answerer import DATA, IDENTITY, Answerer, block
from pyvisa.constants import ResourceAttribute, StatusCode
from pyvisa.errors import VisaIOError

from benchtool_drivers.loopback.faults import TransportFault
from benchtool_drivers.loopback.serving import serve

TIMEOUT_MS = 200


class StuckError(Exception):
    """The library had not returned in time."""


@contextmanager
def stopped_after(seconds: float) -> Iterator[None]:
    """Raise out of the library where it does not return."""

    def stop(_number: int, _frame: FrameType | None) -> None:
        raise StuckError

    guard = signal.signal(signal.SIGALRM, stop)
    left_s, _ = signal.setitimer(signal.ITIMER_REAL, seconds)
    try:
        yield
    finally:
        signal.signal(signal.SIGALRM, guard)
        signal.setitimer(signal.ITIMER_REAL, left_s)


@contextmanager
def opened(resource: str, **options: Any) -> Iterator[Any]:
    """Open a resource with the library alone."""
    found: Any = pyvisa.ResourceManager("@py").open_resource(resource, **options)
    found.timeout = TIMEOUT_MS
    found.write_termination = "\n"
    try:
        yield found
    finally:
        found.close()


def test_a_socket_that_was_closed_is_not_seen_and_looks_like_silence() -> None:
    fault = TransportFault(kind="close-before", on="NAME")
    with serve(Answerer(), "socket", fault) as resource, opened(resource) as found:
        found.write("NAME?")
        with pytest.raises(VisaIOError) as caught:
            found.read_bytes(1)
        assert caught.value.error_code == StatusCode.error_timeout


def test_a_device_clear_on_a_socket_that_was_closed_never_ends() -> None:
    fault = TransportFault(kind="close-before", on="NAME")
    with serve(Answerer(), "socket", fault) as resource, opened(resource) as found:
        found.write("NAME?")
        select.select([found.visalib.sessions[found.session].interface], [], [], 2.0)
        with pytest.raises(StuckError), stopped_after(0.5):
            found.clear()


def test_opening_a_socket_where_nobody_listens_succeeds() -> None:
    with serve(Answerer(), "socket") as resource:
        pass
    with opened(resource) as found, pytest.raises(ConnectionRefusedError):
        found.write("NAME?")


def test_nagles_algorithm_is_on_and_cannot_be_turned_off_by_its_attribute() -> None:
    with serve(Answerer(), "socket") as resource, opened(resource) as found:
        beneath = found.visalib.sessions[found.session].interface
        assert not beneath.getsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY)
        with pytest.raises(Exception, match="attribute"):
            found.set_visa_attribute(ResourceAttribute.tcpip_nodelay, True)


def test_without_a_terminator_a_socket_reads_into_the_time_limit() -> None:
    with serve(Answerer(), "socket") as resource, opened(resource) as found:
        with pytest.raises(VisaIOError) as caught:
            found.query("NAME?")
        assert caught.value.error_code == StatusCode.error_timeout


def test_with_a_terminator_a_block_is_cut_at_its_first_line_feed() -> None:
    with (
        serve(Answerer(), "socket") as resource,
        opened(resource, read_termination="\n") as found,
    ):
        found.write("DATA?")
        assert len(found.read_raw()) < 300


def test_a_count_that_is_too_small_is_not_noticed() -> None:
    short = block(DATA, count=len(DATA) - 7)
    with (
        serve(Answerer({"ODD?": short}), "socket") as resource,
        opened(resource, read_termination="\n") as found,
    ):
        values = found.query_binary_values("ODD?", datatype="B", expect_termination=False)
        assert len(values) == len(DATA) - 7


def test_what_a_read_had_when_its_time_ran_out_is_lost() -> None:
    with serve(Answerer(), "socket") as resource, opened(resource) as found:
        found.write("NAME?")
        with pytest.raises(VisaIOError):
            found.read_bytes(100)
        with pytest.raises(VisaIOError):
            found.read_bytes(1)


def test_the_time_limit_of_a_socket_holds_for_each_piece_and_not_for_the_whole() -> None:
    fault = TransportFault(kind="trickle", on="DATA", wait_s=0.03, piece_bytes=2000)
    with serve(Answerer(), "socket", fault) as resource, opened(resource) as found:
        found.write("DATA?")
        began_s = time.monotonic()
        found.read_bytes(len(block(DATA)), chunk_size=4096)
        assert time.monotonic() - began_s > 2 * TIMEOUT_MS / 1000


def test_hislip_spins_where_more_is_asked_for_than_the_message_holds() -> None:
    with serve(Answerer(), "hislip") as resource, opened(resource) as found:
        found.write("NAME?")
        with pytest.raises(StuckError), stopped_after(2.5 * TIMEOUT_MS / 1000):
            found.read_bytes(100)


def test_a_hislip_device_clear_fails_where_an_answer_was_not_read() -> None:
    with serve(Answerer(), "hislip") as resource, opened(resource) as found:
        found.write("NAME?")
        time.sleep(0.05)
        with pytest.raises(RuntimeError, match="expected message type"):
            found.clear()


def test_a_hislip_message_that_was_not_read_to_its_end_spoils_the_next() -> None:
    with serve(Answerer(), "hislip") as resource, opened(resource) as found:
        found.write("DATA?")
        found.read_bytes(10)
        with pytest.raises(RuntimeError, match="synchronization"):
            found.query("NAME?")


def test_a_hislip_connection_that_was_closed_is_a_bare_runtime_error() -> None:
    fault = TransportFault(kind="close-before", on="NAME")
    with serve(Answerer(), "hislip", fault) as resource, opened(resource) as found:
        found.write("NAME?")
        with pytest.raises(RuntimeError, match="dropped by server"):
            found.read_bytes(1)


def test_opening_hislip_where_nobody_listens_leaves_a_socket_open(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    with serve(Answerer(), "hislip") as resource:
        pass
    made: list[socket.socket] = []

    class Noted(socket.socket):
        def __init__(self, *arguments: Any, **options: Any) -> None:
            super().__init__(*arguments, **options)
            made.append(self)

    monkeypatch.setattr(socket, "socket", Noted)
    with pytest.raises(VisaIOError):
        pyvisa.ResourceManager("@py").open_resource(resource)
    assert [entry.fileno() >= 0 for entry in made] == [True]
    made[0].close()


def test_vxi11_sees_a_closed_connection_only_a_second_after_the_time_limit() -> None:
    fault = TransportFault(kind="close-before", on="NAME")
    with serve(Answerer(), "vxi11", fault) as resource, opened(resource) as found:
        found.write("NAME?")
        began_s = time.monotonic()
        with pytest.raises(VisaIOError) as caught:
            found.read_bytes(1)
        assert caught.value.error_code == StatusCode.error_io
        assert time.monotonic() - began_s > TIMEOUT_MS / 1000 + 0.9
        beneath = found.visalib.sessions[found.session].interface.sock
        beneath.shutdown(socket.SHUT_RDWR)  # or closing takes five seconds more


def test_vxi11_runs_out_of_time_on_an_answer_in_pieces_that_each_came_in_time() -> None:
    fault = TransportFault(kind="trickle", on="DATA", wait_s=0.02, piece_bytes=2000)
    with serve(Answerer(), "vxi11", fault) as resource, opened(resource) as found:
        found.write("DATA?")
        with pytest.raises(VisaIOError) as caught:
            found.read_bytes(len(block(DATA)), chunk_size=1 << 20)
        assert caught.value.error_code == StatusCode.error_timeout


def test_usbtmc_has_no_device_clear() -> None:
    with serve(Answerer(), "usbtmc") as resource, opened(resource) as found:
        with pytest.raises(VisaIOError) as caught:
            found.clear()
        assert caught.value.error_code == StatusCode.error_nonsupported_operation


def test_usbtmc_reads_to_the_end_of_a_message_whatever_was_asked_for() -> None:
    fault = TransportFault(kind="trickle", on="DATA", wait_s=0.0, piece_bytes=3000)
    with serve(Answerer(), "usbtmc", fault) as resource, opened(resource) as found:
        found.write("DATA?")
        assert found.read_bytes(4096) == block(DATA)


def test_a_usb_instrument_that_was_unplugged_is_a_bare_value_error_when_written_to() -> None:
    fault = TransportFault(kind="unplug", on="NAME")
    with serve(Answerer(), "usbtmc", fault) as resource, opened(resource) as found:
        found.write("NAME?")
        with pytest.raises(OSError, match="No such device"):
            found.read_raw()
        with pytest.raises(ValueError, match="No such device"):
            found.write("NAME?")


def test_a_serial_line_is_read_one_byte_a_call() -> None:
    with serve(Answerer(), "pty") as resource, opened(resource, read_termination="\n") as found:
        port = found.visalib.sessions[found.session].interface
        n_calls = 0
        read = port.read

        def counting(n_bytes: int) -> bytes:
            nonlocal n_calls
            n_calls += 1
            assert n_bytes == 1
            return bytes(read(n_bytes))

        port.read = counting
        assert found.query("*IDN?") == IDENTITY
        assert n_calls == len(IDENTITY) + 1
