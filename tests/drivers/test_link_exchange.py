"""What was said is written down, and can be played back."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from answerer import DATA, IDENTITY, Answerer

from benchtool.errors import InputError, InstrumentError, InstrumentTimeoutError, RefusedError
from benchtool_drivers.link import ExchangeLog, Link, LinkSettings
from benchtool_drivers.link.exchange import read_exchanges
from benchtool_drivers.loopback.faults import TransportFault
from benchtool_drivers.loopback.playback import Playback
from benchtool_drivers.loopback.serving import TRANSPORTS, serve

pytestmark = pytest.mark.usefixtures("short_quiet")
SHORT = LinkSettings(timeout_s=0.2, block_timeout_s=0.2)


def talk(link: Link) -> list[object]:
    """Do what a capture does, and return all that came of it."""
    link.send("*CLS")
    heard: list[object] = [link.identity, link.ask("NAME?"), link.ask_block("DATA?")]
    heard += [link.ask_text_list("NAME?"), link.ask("SET 1;NAME?"), link.errors()]
    try:
        link.ask("NONE?")
    except InstrumentError as error:
        heard.append((type(error), error.message))
    heard.append(link.ask("NAME?"))
    return heard


@pytest.mark.parametrize("transport", TRANSPORTS)
def test_a_log_played_back_gives_the_same_answers(transport: str, tmp_path: Path) -> None:
    path = tmp_path / "said.jsonl"
    with ExchangeLog(path, whole=True) as log, serve(Answerer(), transport) as resource:
        link = Link.open(resource, SHORT, log=log)
        heard = talk(link)
        link.close()
    subject = Playback.load(path)
    with serve(subject, transport) as resource:
        link = Link.open(resource, SHORT)
        assert talk(link) == heard
        link.close()
    assert subject.unexpected == []
    assert DATA in heard
    assert any(isinstance(entry, tuple) and RefusedError in entry for entry in heard)


def test_a_line_says_when_what_and_how_much(tmp_path: Path) -> None:
    path = tmp_path / "said.jsonl"
    with ExchangeLog(path) as log, serve(Answerer(), "socket") as resource:
        link = Link.open(resource, SHORT, log=log)
        link.ask_block("DATA?")
        link.close()
    lines = [json.loads(line) for line in path.read_text().splitlines()]
    assert lines[0]["log"] == "benchtool-exchange/1"
    last = lines[-1]
    assert last["command"] == "DATA?"
    assert last["n_bytes"] == len(DATA) + len("#551200\n")
    assert bytes.fromhex(last["hex"]) == b"#551200" + DATA[: 64 - 7]
    assert last["text"].startswith(r"'#551200\x00\x01\x02")
    assert 0 <= last["at_s"] < 5
    assert 0 <= last["took_s"] < 5
    assert "whole" not in last
    assert "error" not in last


def test_a_failure_is_written_down_with_what_had_come(tmp_path: Path) -> None:
    path = tmp_path / "said.jsonl"
    fault = TransportFault(kind="half-stall", on=r"^DATA\?")
    with ExchangeLog(path) as log, serve(Answerer(), "socket", fault) as resource:
        link = Link.open(resource, SHORT, log=log)
        with pytest.raises(InstrumentTimeoutError):
            link.ask_block("DATA?")
        link.ask("NAME?")
        link.close()
    failed = next(entry for entry in read_exchanges(path) if entry.error)
    assert (failed.command, failed.error) == ("DATA?", "instrument-timeout")
    assert failed.n_bytes == (len(DATA) + len("#551200\n")) // 2
    assert '"note": "resynchronised"' in path.read_text()


def test_a_command_that_was_not_recorded_is_answered_by_nothing_and_said(tmp_path: Path) -> None:
    path = tmp_path / "said.jsonl"
    with ExchangeLog(path) as log, serve(Answerer(), "socket") as resource:
        Link.open(resource, SHORT, log=log).close()
    said: list[str] = []
    subject = Playback.load(path, say=said.append)
    with serve(subject, "socket") as resource:
        link = Link.open(resource, LinkSettings(timeout_s=0.2, error_query=None))
        assert link.identity == IDENTITY
        with pytest.raises(InstrumentTimeoutError):
            link.ask("NAME?")
        assert link.ask("*IDN?") == IDENTITY
        link.close()
    assert said == subject.unexpected == ["NAME?"]


def test_answers_of_one_command_come_in_their_order_and_the_last_one_stays() -> None:
    answers = [b"WAIT\n", b"WAIT\n", b"DONE\n"]
    with_lines = [
        {
            "resource": "r",
            "command": "STAT?",
            "answer": answer,
            "n_bytes": 5,
            "error": "",
            "line": 1,
        }
        for answer in answers
    ]
    from benchtool_drivers.link.exchange import Exchange

    subject = Playback(Exchange(**entry) for entry in with_lines)
    heard = []
    for _ in range(5):
        subject.receive(b"STAT?")
        heard.append(subject.output())
    assert heard == [*answers, b"DONE\n", b"DONE\n"]
    assert subject.output() is None


def test_a_log_without_whole_answers_says_which_one_is_missing(tmp_path: Path) -> None:
    path = tmp_path / "said.jsonl"
    with ExchangeLog(path) as log, serve(Answerer(), "socket") as resource:
        link = Link.open(resource, SHORT, log=log)
        link.ask_block("DATA?")
        link.close()
    with pytest.raises(InputError, match=r"64 of the 51208 bytes that answered DATA\?"):
        Playback.load(path)


def test_several_connections_in_one_log_are_told_apart(tmp_path: Path) -> None:
    path = tmp_path / "said.jsonl"
    with ExchangeLog(path) as log, serve(Answerer(), "socket") as first:
        Link.open(first, SHORT, log=log).close()
        with serve(Answerer({"NAME?": b"outlet\n"}), "socket") as second:
            link = Link.open(second, SHORT, log=log)
            link.ask("NAME?")
            link.close()
    with pytest.raises(InputError, match="holds exchanges with"):
        Playback.load(path)
    subject = Playback.load(path, resource=second)
    subject.receive(b"NAME?")
    assert subject.output() == b"outlet\n"


@pytest.mark.parametrize(
    "text",
    ["", "not a line", '{"log": "something-else/1"}', '{"command": "A"}'],
    ids=["empty", "no JSON", "another format", "no first line"],
)
def test_what_is_no_log_is_refused(tmp_path: Path, text: str) -> None:
    path = tmp_path / "said.jsonl"
    path.write_text(text + "\n" if text else "")
    with pytest.raises(InputError):
        Playback.load(path)


def test_a_log_that_cannot_be_written_is_told(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="cannot be written"):
        ExchangeLog(tmp_path / "no such folder" / "said.jsonl")


def test_a_log_that_has_no_room_is_named() -> None:
    with pytest.raises(InputError, match="/dev/full") as caught:
        ExchangeLog("/dev/full")
    assert caught.value.code == "not-writable"
