"""What the wires make of bytes that are written out by hand: cut, old, split and wrong ones."""

from __future__ import annotations

import errno
import socket
import struct
from collections.abc import Iterator
from types import SimpleNamespace
from typing import Any

import pytest

from benchtool_drivers.link import LinkSettings
from benchtool_drivers.link.hislip import HislipWire
from benchtool_drivers.link.usbtmc import UsbtmcWire
from benchtool_drivers.link.vxi11 import Vxi11Wire

SHORT_S = 0.05


@pytest.fixture
def ends() -> Iterator[tuple[socket.socket, socket.socket]]:
    """Two ends of a connection: the link's, and the instrument's."""
    near, far = socket.socketpair()
    with near, far:
        far.settimeout(1.0)
        yield near, far


def frame(kind: int, payload: bytes = b"", parameter: int = 0) -> bytes:
    """Return a HiSLIP message (IVI-6.1, table 3)."""
    return struct.pack("!2sBBIQ", b"HS", kind, 0, parameter, len(payload)) + payload


def hislip(near: socket.socket, last_message_id: int = 8) -> HislipWire:
    """Return a wire on one end, the last command having had that number."""
    interface = SimpleNamespace(_sync=near, last_message_id=last_message_id, _rmt=0)
    return HislipWire(SimpleNamespace(timeout=0), SimpleNamespace(interface=interface))


def read(wire: Any, n_bytes: int = 100) -> tuple[bytes, bool]:
    """Read once."""
    view = memoryview(bytearray(n_bytes))
    n_read, ended = wire.read_into(view, SHORT_S)
    return bytes(view[:n_read]), ended


def test_hislip_goes_on_within_a_header_that_a_time_limit_cut(ends: Any) -> None:
    near, far = ends
    wire = hislip(near)
    whole = frame(7, b"spacing\n", 8)
    far.sendall(whole[:10])
    with pytest.raises(TimeoutError):
        read(wire)
    far.sendall(whole[10:])
    assert read(wire) == (b"spacing\n", True)
    assert not wire.broken


def test_hislip_goes_on_within_a_message_that_a_time_limit_cut(ends: Any) -> None:
    near, far = ends
    wire = hislip(near)
    whole = frame(7, b"spacing\n", 8)
    far.sendall(whole[:19])
    assert read(wire) == (b"spa", False)
    with pytest.raises(TimeoutError):
        read(wire)
    far.sendall(whole[19:])
    assert read(wire) == (b"cing\n", True)


def test_hislip_joins_the_messages_of_one_answer(ends: Any) -> None:
    near, far = ends
    wire = hislip(near)
    far.sendall(frame(6, b"spa", 8) + frame(6, b"", 8) + frame(7, b"cing", 8))
    assert [read(wire) for _ in range(3)] == [(b"spa", False), (b"", False), (b"cing", True)]
    assert read(wire) == (b"", True)


def test_hislip_drops_answers_to_other_commands(ends: Any) -> None:
    near, far = ends
    wire = hislip(near)
    far.sendall(frame(7, b"old" * 1000, 6) + frame(13, b"", 6) + frame(7, b"new", 8))
    assert read(wire) == (b"new", True)


def test_hislip_takes_an_answer_that_is_marked_as_fitting_any_command(ends: Any) -> None:
    near, far = ends
    wire = hislip(near)
    far.sendall(frame(7, b"new", 0xFFFFFFFF))
    assert read(wire) == (b"new", True)


def test_hislip_tells_an_error_of_the_protocol_in_its_words(ends: Any) -> None:
    near, far = ends
    wire = hislip(near)
    far.sendall(frame(2, b"Poorly formed message header"))
    with pytest.raises(ConnectionError, match="Poorly formed"):
        read(wire)
    assert wire.broken


def test_hislip_is_broken_by_what_is_no_message(ends: Any) -> None:
    near, far = ends
    wire = hislip(near)
    far.sendall(b"HTTP/1.1 400 Bad Request\r\n")
    with pytest.raises(ConnectionError, match="no HiSLIP message"):
        read(wire)
    assert wire.broken


def test_hislip_sees_the_end_of_the_connection(ends: Any) -> None:
    near, far = ends
    wire = hislip(near)
    assert not wire.gone()
    far.sendall(frame(7, b"spacing\n", 8)[:19])
    far.close()
    assert read(wire) == (b"spa", False)
    assert wire.gone()
    with pytest.raises(ConnectionError):
        read(wire)


def vxi11(near: socket.socket) -> Vxi11Wire:
    """Return a wire on one end; the next call has the serial number 6."""
    client = SimpleNamespace(sock=near, lastxid=5, prog=0x0607AF, vers=1)
    session = SimpleNamespace(interface=client, link=1, lock_timeout=0, max_recv_size=1 << 16)
    return Vxi11Wire(SimpleNamespace(timeout=0), session)


def reply(
    data: bytes, *, serial: int = 6, error: int = 0, reason: int = 4, state: int = 0
) -> bytes:
    """Return the reply to a read (VXI-11, B.6.4), without its record mark."""
    head = struct.pack("!6I", serial, 1, state, 0, 0, 0)
    padding = bytes(-len(data) % 4)
    return head + struct.pack("!3I", error, reason, len(data)) + data + padding


def record(*fragments: bytes) -> bytes:
    """Mark fragments as one record (RFC 5531, section 11)."""
    marked = [
        struct.pack("!I", len(part) | (0x80000000 if at == len(fragments) - 1 else 0)) + part
        for at, part in enumerate(fragments)
    ]
    return b"".join(marked)


def test_vxi11_reads_a_reply_in_one_piece_and_in_many(ends: Any) -> None:
    near, far = ends
    whole = reply(b"spacing\n!")
    for fragments in ((whole,), (whole[:3], whole[3:40], b"", whole[40:])):
        far.sendall(record(*fragments))
        assert read(vxi11(near)) == (b"spacing\n!", True)


def test_vxi11_tells_the_end_from_a_count_that_was_reached(ends: Any) -> None:
    near, far = ends
    far.sendall(record(reply(b"spa", reason=1)) + record(reply(b"cing", serial=7, reason=4)))
    wire = vxi11(near)
    assert read(wire, 3) == (b"spa", False)
    assert read(wire, 4) == (b"cing", True)


def test_vxi11_drops_the_reply_to_a_call_that_was_given_up(ends: Any) -> None:
    near, far = ends
    far.sendall(record(reply(b"late", serial=5)) + record(reply(b"new")))
    assert read(vxi11(near)) == (b"new", True)


@pytest.mark.parametrize(
    ("wrong", "kind"),
    [
        (reply(b"", error=15, reason=0), TimeoutError),
        (reply(b"", reason=0), TimeoutError),
        (reply(b"", error=17, reason=0), OSError),
        (reply(b"", state=1), OSError),
        (reply(b"x" * 101), OSError),
        (reply(b"spacing")[:30], OSError),
    ],
    ids=["time limit", "nothing", "error", "denied", "too much", "cut"],
)
def test_vxi11_refuses_a_reply_that_is_none(ends: Any, wrong: bytes, kind: type) -> None:
    near, far = ends
    far.sendall(record(wrong))
    with pytest.raises(kind):
        read(vxi11(near))


def test_vxi11_sees_the_end_of_the_connection_at_once(ends: Any) -> None:
    near, far = ends
    wire = vxi11(near)
    far.sendall(record(reply(b"spacing"))[:30])
    far.shutdown(socket.SHUT_WR)
    with pytest.raises(ConnectionError):
        read(wire)
    assert wire.broken


def test_vxi11_sends_a_long_command_in_pieces_and_marks_the_last(ends: Any) -> None:
    near, far = ends
    wire = vxi11(near)
    wire._session.max_recv_size = 4
    taken = [struct.pack("!6I", serial, 1, 0, 0, 0, 0) for serial in (6, 7)]
    far.sendall(record(taken[0] + struct.pack("!2I", 0, 4)))
    far.sendall(record(taken[1] + struct.pack("!2I", 0, 2)))
    wire.write(b"NAME?\n", SHORT_S)
    sent = far.recv(1000)
    first, second = sent[: 4 + 40 + 20 + 4], sent[4 + 40 + 20 + 4 :]
    assert first.endswith(struct.pack("!iI", 0, 4) + b"NAME")
    assert second.endswith(struct.pack("!iI", 8, 2) + b"?\n\x00\x00")


class Endpoint:
    """The two endpoints of a USB device: takes requests, gives transfers."""

    wMaxPacketSize = 64

    def __init__(self, *transfers: bytes | OSError) -> None:
        self.transfers = list(transfers)
        self.requests: list[bytes] = []
        self.aborted: list[int] = []

    def write(self, data: bytes, _timeout_ms: int) -> int:
        """Take a request."""
        self.requests.append(data)
        return len(data)

    def read(self, _size: int, _timeout_ms: int) -> bytes:
        """Give the next transfer."""
        given = self.transfers.pop(0)
        if isinstance(given, OSError):
            raise given
        return given


def usbtmc(endpoint: Endpoint) -> UsbtmcWire:
    """Return a wire on it; the next request has the tag 1."""
    interface = SimpleNamespace(
        _btag=0,
        timeout=50,
        usb_send_ep=endpoint,
        usb_recv_ep=endpoint,
        _abort_bulk_in=endpoint.aborted.append,
    )
    return UsbtmcWire(SimpleNamespace(timeout=0), SimpleNamespace(interface=interface))


def transfer(data: bytes, *, tag: int = 1, end: int = 1, said: int | None = None) -> bytes:
    """Return a transfer with its header (USBTMC, table 9), padded to a multiple of four."""
    said = len(data) if said is None else said
    return struct.pack("<BBBxIBxxx", 2, tag, tag ^ 0xFF, said, end) + data + bytes(-len(data) % 4)


def test_usbtmc_gives_a_transfer_and_says_whether_it_was_the_last() -> None:
    endpoint = Endpoint(transfer(b"spa", end=0), transfer(b"cing\n", tag=2))
    wire = usbtmc(endpoint)
    assert read(wire) == (b"spa", False)
    assert read(wire) == (b"cing\n", True)
    assert endpoint.requests[0] == struct.pack("<BBBxIBBxx", 2, 1, 0xFE, 100, 0, 0)


def test_usbtmc_joins_the_packets_of_one_transfer() -> None:
    endpoint = Endpoint(transfer(b"spac", said=8), b"in", b"g\n\x00\x00")
    assert read(usbtmc(endpoint)) == (b"spacing\n", True)


@pytest.mark.parametrize(
    "wrong",
    [transfer(b"x", tag=2), transfer(b"x", said=101), b"\x02\x01", b"\x01" + transfer(b"x")[1:]],
    ids=["tag", "too much", "no header", "kind"],
)
def test_usbtmc_refuses_and_ends_a_transfer_that_was_not_asked_for(wrong: bytes) -> None:
    endpoint = Endpoint(wrong)
    with pytest.raises(OSError, match="USB transfer"):
        read(usbtmc(endpoint))
    assert endpoint.aborted == [1]


def test_usbtmc_ends_a_transfer_that_takes_too_long() -> None:
    endpoint = Endpoint(OSError(errno.ETIMEDOUT, "Operation timed out"))
    with pytest.raises(TimeoutError):
        read(usbtmc(endpoint))
    assert endpoint.aborted == [1]


@pytest.mark.parametrize(
    "wrong",
    [
        {"timeout_s": 0.0},
        {"block_timeout_s": -1.0},
        {"deadline_s": 0.0},
        {"query_delay_s": -0.1},
        {"read_termination": ""},
        {"baud": 0},
    ],
)
def test_settings_that_mean_nothing_are_refused(wrong: dict[str, Any]) -> None:
    with pytest.raises(ValueError):  # noqa: PT011 - each says its own
        LinkSettings(**wrong)
