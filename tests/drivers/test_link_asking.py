"""What the link gives when all goes well, on each transport."""

from __future__ import annotations

import socket
import threading
import time
from collections import deque
from contextlib import closing

import pytest
from answerer import DATA, IDENTITY, Answerer, block

from benchtool.errors import (
    InstrumentTimeoutError,
    NotConnectedError,
    ReplyError,
    UsageError,
)
from benchtool_drivers.link import Link, LinkSettings
from benchtool_drivers.link.text import joined, printable
from benchtool_drivers.loopback.faults import TransportFault
from benchtool_drivers.loopback.serving import TRANSPORTS, serve, serve_forever

pytestmark = pytest.mark.usefixtures("short_quiet")
SHORT = LinkSettings(timeout_s=0.2, block_timeout_s=0.2)
STREAMS = ("socket", "pty")
MESSAGES = ("hislip", "vxi11", "usbtmc")
transports = pytest.mark.parametrize("transport", TRANSPORTS)


@transports
def test_text_blocks_lists_and_commands_go_both_ways(transport: str) -> None:
    subject = Answerer({"LIST?": b"1.5,-2,3E-3\r\n"})
    with serve(subject, transport) as resource:
        link = Link.open(resource, SHORT)
        assert link.identity == IDENTITY
        assert link.resource == resource
        assert link.ask("NAME?", match="^spa") == "spacing"
        assert link.ask_block("DATA?") == DATA
        assert link.ask_block("DATA?", n_bytes=len(DATA)) == DATA
        assert link.ask_text_list("LIST?") == b"1.5,-2,3E-3"
        link.send("SET 1")
        assert link.ask("SET 1;NAME?") == "spacing"
        assert link.last_good == r"SET 1;NAME? -> 'spacing\n'"
        link.close()
    assert "SET 1" in subject.heard


@transports
@pytest.mark.parametrize("n_bytes", [0, 1, 500, 512 - 12 - 3, 4096, 65536, (1 << 20) + 5])
def test_a_block_of_any_length_comes_whole(transport: str, n_bytes: int) -> None:
    if transport == "pty" and n_bytes > 100_000:
        pytest.skip("a pseudo-terminal passes 4 KiB at a time")
    data = (DATA * (n_bytes // len(DATA) + 1))[:n_bytes]
    with serve(Answerer({"ODD?": block(data)}), transport) as resource:
        link = Link.open(resource, SHORT)
        assert link.ask_block("ODD?", n_bytes=n_bytes) == data
        assert link.ask("NAME?") == "spacing"
        link.close()


@transports
@pytest.mark.parametrize("n_bytes", [4096, 65536, 65537])
def test_a_text_as_long_as_a_piece_that_is_read_ends_where_it_ends(
    transport: str, n_bytes: int
) -> None:
    text = b"1" * (n_bytes - 1) + b"\n"
    with serve(Answerer({"LONG?": text}), transport) as resource:
        link = Link.open(resource, SHORT)
        assert len(link.ask_text_list("LONG?")) == n_bytes - 1
        assert link.ask("NAME?") == "spacing"
        link.close()


@transports
def test_bytes_that_are_left_are_dropped_after_a_look_at_the_first(transport: str) -> None:
    with serve(Answerer(), transport) as resource:
        link = Link.open(resource, SHORT)
        assert link.ask_raw("DATA?", 12) == b"#551200" + DATA[:5]
        assert link.ask("NAME?") == "spacing"
        assert link.ask_block("DATA?") == DATA
        link.close()


@transports
def test_a_block_without_a_terminator_is_read_where_that_is_said(transport: str) -> None:
    with serve(Answerer({"BARE?": block(DATA, trailer=b"")}), transport) as resource:
        link = Link.open(resource, SHORT)
        assert link.ask_block("BARE?", trailer="") == DATA
        assert link.ask("NAME?") == "spacing"
        link.close()


@transports
def test_a_header_may_count_in_words(transport: str) -> None:
    counted_in_words = block(DATA, count=len(DATA) // 2)
    with serve(Answerer({"WORDS?": counted_in_words}), transport) as resource:
        link = Link.open(resource, SHORT)
        assert link.ask_block("WORDS?", length_unit_bytes=2) == DATA
        link.close()


@pytest.mark.parametrize("transport", MESSAGES)
def test_a_block_without_a_count_ends_with_its_message(transport: str) -> None:
    with serve(Answerer({"OPEN?": b"#0" + DATA + b"\n"}), transport) as resource:
        link = Link.open(resource, SHORT)
        assert link.ask_block("OPEN?", wrap="indefinite") == DATA
        assert link.ask("NAME?") == "spacing"
        link.close()


@pytest.mark.parametrize("transport", STREAMS)
def test_a_block_without_a_count_needs_its_length_on_a_stream(transport: str) -> None:
    with serve(Answerer({"OPEN?": b"#0" + DATA + b"\n"}), transport) as resource:
        link = Link.open(resource, SHORT)
        with pytest.raises(ReplyError, match="does not mark its end"):
            link.ask_block("OPEN?", wrap="indefinite")
        assert link.ask_block("OPEN?", wrap="indefinite", n_bytes=len(DATA)) == DATA
        assert link.ask("NAME?") == "spacing"
        link.close()


def checksummed(data: bytes, *, wrong: int = 0) -> bytes:
    """Wrap data as the oldest form: count with the checksum, sum a multiple of 256."""
    count = (len(data) + 1).to_bytes(2, "big")
    checksum = (-(sum(count) + sum(data)) + wrong) % 256
    return b"%" + count + data + bytes([checksum]) + b"\n"


@transports
def test_a_checksum_is_checked(transport: str) -> None:
    data = DATA[:5000]
    answers = {"GOOD?": checksummed(data), "BAD?": checksummed(data, wrong=1)}
    with serve(Answerer(answers), transport) as resource:
        link = Link.open(resource, SHORT)
        assert link.ask_block("GOOD?", wrap="counted-checksum", n_bytes=5000) == data
        with pytest.raises(ReplyError, match="checksum"):
            link.ask_block("BAD?", wrap="counted-checksum")
        assert link.ask("NAME?") == "spacing"
        link.close()


@transports
def test_progress_is_told_up_to_the_end(transport: str) -> None:
    told: list[tuple[int, int]] = []
    with serve(Answerer(), transport) as resource:
        link = Link.open(resource, SHORT)
        link.ask_block("DATA?", progress=lambda behind, in_all: told.append((behind, in_all)))
        link.close()
    assert told[-1] == (len(DATA), len(DATA))
    assert told == sorted(told)


@transports
def test_the_error_queue_is_read_until_it_is_empty(transport: str) -> None:
    subject = Answerer()
    subject.queue = [b'-222,"Data out of range"', b'-410,"Query INTERRUPTED"']
    with serve(subject, transport) as resource:
        link = Link.open(resource, SHORT)
        assert link.errors() == ('-222,"Data out of range"', '-410,"Query INTERRUPTED"')
        assert link.errors() == ()
        link.use(LinkSettings(error_query=None))
        subject.queue = [b"-1"]
        assert link.errors() == ()
        link.close()


def test_an_error_queue_that_never_empties_is_not_read_for_ever() -> None:
    subject = Answerer()
    subject.queue = [b"-350"] * 1000
    with serve(subject, "socket") as resource:
        link = Link.open(resource, SHORT)
        assert len(link.errors()) == 32
        link.close()


@transports
def test_what_is_no_text_is_refused_where_text_is_to_come(transport: str) -> None:
    with serve(Answerer({"ODD?": b"\x00\x01\x02\n"}), transport) as resource:
        link = Link.open(resource, SHORT)
        with pytest.raises(ReplyError, match="no line of text"):
            link.ask("ODD?")
        assert link.ask("NAME?") == "spacing"
        link.close()


@transports
def test_a_text_that_does_not_fit_is_refused_with_both_in_the_step(transport: str) -> None:
    with serve(Answerer(), transport) as resource:
        link = Link.open(resource, SHORT)
        with pytest.raises(ReplyError) as caught:
            link.ask("NAME?", match=r"^\d+$")
        assert caught.value.step.expected == r"text like ^\d+$"
        assert caught.value.step.got == r"'spacing\n'"
        link.close()


@pytest.mark.parametrize("transport", STREAMS)
def test_an_instrument_that_repeats_commands_is_read_when_that_is_said(transport: str) -> None:
    always = TransportFault(kind="echo", times=None)
    with serve(Answerer(), transport, always) as resource:
        with pytest.raises(ReplyError, match="repeats the command"):
            Link.open(resource, SHORT)
        settings = LinkSettings(timeout_s=0.2, block_timeout_s=0.2, echo=True)
        link = Link.open(resource, settings)
        assert link.ask("NAME?") == "spacing"
        assert link.ask_block("DATA?") == DATA
        link.close()


class Prompting(Answerer):
    """Prints a prompt after each exchange."""

    def receive(self, message: bytes) -> None:
        """Take a message; a prompt follows its answer."""
        super().receive(message)
        self._out.append((self._out.pop() if self._out else b"") + b"> ")


@pytest.mark.parametrize("transport", STREAMS)
def test_a_prompt_is_read_after_each_exchange(transport: str) -> None:
    settings = LinkSettings(timeout_s=0.2, block_timeout_s=0.2, prompt="> ")
    with serve(Prompting(), transport) as resource:
        link = Link.open(resource, settings)
        link.send("SET 1")
        assert link.ask("NAME?") == "spacing"
        assert link.ask_block("DATA?") == DATA
        with pytest.raises(ReplyError):
            link.ask("NAME?", match="outlet")
        assert link.ask("NAME?") == "spacing"
        assert not link.reopened
        link.close()


def test_a_rest_between_command_and_answer_is_kept() -> None:
    with serve(Answerer(), "socket") as resource:
        link = Link.open(resource, LinkSettings(query_delay_s=0.05))
        began_s = time.monotonic()
        link.ask("NAME?")
        assert time.monotonic() - began_s >= 0.05
        link.close()


def test_small_writes_are_not_held_back() -> None:
    """Two commands before a query take 40 ms each time where Nagle's algorithm is on."""
    with serve(Answerer(), "socket") as resource:
        link = Link.open(resource, SHORT)
        assert link._conversation._wire is not None
        beneath = link._conversation._wire._socket  # type: ignore[attr-defined]
        assert beneath.getsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY)
        link.close()


def test_a_serial_line_is_opened_at_the_rate_that_is_said() -> None:
    with serve(Answerer(), "pty") as resource:
        link = Link.open(resource, LinkSettings(timeout_s=0.2, baud=115200))
        assert link._conversation._wire is not None
        assert link._conversation._wire._port.baudrate == 115200  # type: ignore[attr-defined]
        link.close()


@pytest.mark.parametrize("command", ["", "NAME?\n", "NÄME?", "NAME?\x00"])
def test_a_command_that_cannot_be_sent_is_a_matter_of_usage(command: str) -> None:
    with serve(Answerer(), "socket") as resource:
        link = Link.open(resource, SHORT)
        with pytest.raises(UsageError):
            link.ask(command)
        assert link.ask("NAME?") == "spacing"
        link.close()


def test_a_closed_link_says_so() -> None:
    with serve(Answerer(), "socket") as resource:
        link = Link.open(resource, SHORT)
        link.close()
        link.close()
        with pytest.raises(NotConnectedError, match="was closed"):
            link.ask("NAME?")


@transports
def test_an_old_answer_is_not_taken_for_the_identity(transport: str) -> None:
    fault = TransportFault(kind="prefix", on=r"IDN", prefix=b"outlet\n")
    with serve(Answerer(), transport, fault) as resource:
        link = Link.open(resource, SHORT)
        assert link.identity == IDENTITY
        assert link.ask("NAME?") == "spacing"
        assert link.ask("*IDN?") == IDENTITY
        link.close()


class Greeting(Answerer):
    """Prints a banner when somebody connects."""

    def clear(self) -> None:
        """Begin anew, with the banner."""
        super().clear()
        self._out.append(b"spacing timer ready\n")


def test_a_banner_is_not_taken_for_the_identity() -> None:
    with serve(Greeting(), "socket") as resource:
        link = Link.open(resource, SHORT)
        assert link.identity == IDENTITY
        assert link.ask("NAME?") == "spacing"
        link.close()


class Undecided(Answerer):
    """Is somebody else each time."""

    def receive(self, message: bytes) -> None:
        """Take a message; the identity counts them."""
        self.heard.append(message.decode())
        self._out.append(b"loopback,%d\n" % len(self.heard))


def test_an_identity_that_changes_is_refused() -> None:
    with (
        serve(Undecided(), "hislip") as resource,
        pytest.raises(ReplyError, match="otherwise each time"),
    ):
        Link.open(resource, SHORT)


@transports
def test_an_instrument_that_says_nothing_is_not_opened(transport: str) -> None:
    with serve(Answerer(), transport, TransportFault(kind="silent", times=None)) as resource:
        with pytest.raises(InstrumentTimeoutError) as caught:
            Link.open(resource, SHORT)
        assert caught.value.step.command == "*IDN?"


def test_what_stands_at_no_address_is_told() -> None:
    for resource in ("this is no resource", "TCPIP::127.0.0.1::70000::SOCKET", "TCPIP::h,x::INSTR"):
        with pytest.raises(UsageError) as caught:
            Link.open(resource, SHORT)
        assert caught.value.code == "malformed-resource"


@pytest.mark.parametrize("kind", ["1::SOCKET", "hislip0::INSTR", "INSTR"])
def test_a_name_that_no_address_is_known_for_is_told_as_one(
    kind: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    def unknown(*_: object, **__: object) -> None:
        raise socket.gaierror(socket.EAI_NONAME, "Name or service not known")

    monkeypatch.setattr(socket, "getaddrinfo", unknown)
    with pytest.raises(NotConnectedError, match=r"known for the name bench\.invalid"):
        Link.open(f"TCPIP::bench.invalid::{kind}", SHORT)


def test_a_prompt_nobody_told_of_is_told_as_one() -> None:
    with (
        serve(Prompting(), "socket") as resource,
        pytest.raises(ReplyError) as caught,
    ):
        Link.open(resource, SHORT)
    assert 'prompt = "> "' in caught.value.hint


def test_an_instrument_without_the_query_for_errors_is_told_as_one() -> None:
    settings = LinkSettings(timeout_s=0.2, block_timeout_s=0.2, error_query="FAULT?")
    with serve(Answerer(), "socket") as resource, closing(Link.open(resource, settings)) as link:
        with pytest.raises(InstrumentTimeoutError) as caught:
            link.errors()
        assert "error_query" in caught.value.hint


@transports
def test_an_interruption_leaves_a_link_that_comes_back_in_step(transport: str) -> None:
    fault = TransportFault(kind="trickle", on=r"^DATA\?", wait_s=0.005)

    def interrupt(_behind: int, _in_all: int) -> None:
        raise KeyboardInterrupt

    with serve(Answerer(), transport, fault) as resource:
        link = Link.open(resource, SHORT)
        with pytest.raises(KeyboardInterrupt):
            link.ask_block("DATA?", progress=interrupt)
        assert link.ask("NAME?") == "spacing"
        assert link.ask_block("DATA?") == DATA
        link.close()


@pytest.mark.parametrize(
    ("commands", "message"),
    [
        (("A", "B", "C?"), "A;:B;:C?"),
        (("*CLS", "A"), "*CLS;:A"),
        (("A", "*OPC?"), "A;*OPC?"),
        ((":A", ":B"), ":A;:B"),
    ],
)
def test_commands_are_joined_to_one_message(commands: tuple[str, ...], message: str) -> None:
    assert joined(*commands) == message


def test_bytes_are_shown_in_ascii() -> None:
    assert printable(b"#15\x00\xff\n") == r"'#15\x00\xff\n'"
    assert printable(b"") == ""


class Later(Answerer):
    """Gives an answer some time after it was asked for, as a wait for a trigger does."""

    def __init__(self) -> None:
        super().__init__()
        self._later: deque[tuple[float, bytes]] = deque()

    def receive(self, message: bytes) -> None:
        """Take a message; one of them is answered later."""
        if message == b"*OPC?":
            self._later.append((time.monotonic() + 0.1, b"1\n"))
        else:
            super().receive(message)

    def output(self) -> bytes | None:
        """Return the next answer that is due."""
        if self._later and self._later[0][0] <= time.monotonic():
            return self._later.popleft()[1]
        return super().output()


@transports
def test_an_answer_that_takes_its_time_is_waited_for(transport: str) -> None:
    with serve(Later(), transport) as resource:
        link = Link.open(resource, SHORT)
        assert link.ask("*OPC?", timeout_s=0.5) == "1"
        with pytest.raises(InstrumentTimeoutError):
            link.ask("*OPC?", timeout_s=0.02)
        assert link.ask("NAME?") == "spacing"
        link.close()


def test_serving_for_ever_says_where_and_ends_with_an_interruption() -> None:
    heard: list[str] = []

    def use(resource: str) -> None:
        link = Link.open(resource, SHORT)
        heard.append(link.ask("NAME?"))
        link.close()
        raise KeyboardInterrupt

    n_threads = threading.active_count()
    serve_forever(Answerer(), "socket", use)
    assert heard == ["spacing"]
    assert threading.active_count() == n_threads


@pytest.mark.parametrize("transport", ["socket", "hislip"])
def test_a_port_that_another_program_has_is_refused(transport: str) -> None:
    with socket.create_server(("127.0.0.1", 0)) as taken:
        port = taken.getsockname()[1]
        with (
            pytest.raises(UsageError, match=f"port {port} .* another program"),
            serve(Answerer(), transport, port=port),
        ):
            pass


def test_a_transport_or_fault_that_is_not_known_is_refused() -> None:
    with pytest.raises(ValueError, match="no transport"), serve(Answerer(), "pigeon"):
        pass
    with pytest.raises(ValueError, match="no fault"):
        TransportFault(kind="rain")  # type: ignore[arg-type]
