"""How a connection is brought back in step, seen on a wire that is written out."""

from __future__ import annotations

from collections import deque

import pytest

from benchtool_drivers.link import LinkSettings, recovery
from benchtool_drivers.link.recovery import resynchronise

IDENTITY = "loopback,scripted,0,1"
ANSWER = IDENTITY.encode() + b"\n"
SETTINGS = LinkSettings(timeout_s=0.1)
QUIET = None


class ScriptedWire:
    """Gives what is written out for it; ``None`` is a spell of silence.

    Args:
        script: What comes before the identity is asked for.
        answers: What comes after.
        has_end: Whether answers end of themselves.
    """

    can_clear = True
    broken = False

    def __init__(
        self,
        script: list[bytes | None],
        answers: list[bytes | None] | None = None,
        *,
        has_end: bool = False,
    ) -> None:
        self.has_end = has_end
        self.done: list[str] = []
        self.ended = False
        self._script = deque(script)
        self._answers = [ANSWER] if answers is None else answers

    def write(self, data: bytes, timeout_s: float) -> None:
        """Note the command, and have its answer ready."""
        assert timeout_s > 0
        self.done.append(data.decode().strip())
        self._script.extend(self._answers)

    def read_into(self, view: memoryview, timeout_s: float) -> tuple[int, bool]:
        """Give the next piece."""
        assert timeout_s > 0
        piece = self._script.popleft() if self._script else QUIET
        if piece is QUIET:
            self.done.append("quiet")
            raise TimeoutError
        self.done.append(f"{len(piece)} bytes")
        view[: len(piece)] = piece
        return len(piece), self.has_end

    def unasked(self) -> bool:
        """Say nothing."""
        return False

    def gone(self) -> bool:
        """Say whether the stream has ended."""
        return self.ended

    def clear(self) -> None:
        """Note a device clear."""
        self.done.append("clear")
        self._script.clear()

    def close(self) -> None:
        """Do nothing."""


def test_a_stream_must_be_quiet_twice_before_the_identity_is_asked_for() -> None:
    wire = ScriptedWire([b"rest of a block", QUIET, b"more", QUIET, QUIET])
    assert resynchronise(wire, SETTINGS, IDENTITY)
    assert wire.done == [
        "15 bytes",
        "quiet",
        "4 bytes",
        "quiet",
        "quiet",
        "*IDN?",
        "22 bytes",
        "quiet",
    ]


def test_old_answers_before_the_identity_are_dropped() -> None:
    wire = ScriptedWire([], [b"12.5\n", b"0\nloopback,", b"scripted,0,1\n"])
    assert resynchronise(wire, SETTINGS, IDENTITY)


def test_an_answer_that_comes_after_the_identity_is_dropped_too() -> None:
    wire = ScriptedWire([], [ANSWER, b"12.5\n", ANSWER])
    assert resynchronise(wire, SETTINGS, IDENTITY)
    assert wire.done[-1] == "quiet"
    assert wire.done.count("*IDN?") == 1


def test_a_stream_that_ends_in_another_answer_is_not_in_step() -> None:
    assert not resynchronise(ScriptedWire([], [ANSWER, b"12.5\n"]), SETTINGS, IDENTITY)
    assert not resynchronise(ScriptedWire([], [b"another one\n"]), SETTINGS, IDENTITY)
    assert not resynchronise(ScriptedWire([], []), SETTINGS, IDENTITY)


def test_a_prompt_may_follow_the_identity() -> None:
    settings = LinkSettings(timeout_s=0.1, prompt="> ", read_termination="\r\n")
    answer = IDENTITY.encode() + b"\r\n> "
    assert resynchronise(ScriptedWire([], [b"*IDN?\r\n", answer]), settings, IDENTITY)
    assert not resynchronise(ScriptedWire([], [answer[:-2]]), settings, IDENTITY)


def test_messages_are_cleared_and_not_waited_for() -> None:
    wire = ScriptedWire([b"old"], has_end=True)
    assert resynchronise(wire, SETTINGS, IDENTITY)
    assert wire.done == ["clear", "*IDN?", "22 bytes"]


def test_a_device_clear_is_left_out_where_that_is_said() -> None:
    wire = ScriptedWire([b"old\n"], has_end=True)
    settings = LinkSettings(timeout_s=0.1, device_clear="none")
    assert resynchronise(wire, settings, IDENTITY)
    assert wire.done == ["*IDN?", "4 bytes", "22 bytes"]


def test_a_stream_that_never_stops_is_given_up(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(recovery, "LONGEST_S", 0.05)
    wire = ScriptedWire([b"chatter"] * 1_000_000)
    assert not resynchronise(wire, SETTINGS, IDENTITY)
    assert "*IDN?" not in wire.done


@pytest.mark.parametrize("what", ["broken", "ended"])
def test_a_connection_that_has_gone_is_not_talked_to(what: str) -> None:
    wire = ScriptedWire([])
    setattr(wire, what, True)
    assert not resynchronise(wire, SETTINGS, IDENTITY)
    assert wire.done == []


def test_nothing_but_the_identity_is_ever_asked() -> None:
    for wire in (ScriptedWire([]), ScriptedWire([], has_end=True), ScriptedWire([], [])):
        resynchronise(wire, SETTINGS, IDENTITY)
        said = {entry for entry in wire.done if entry.startswith("*")}
        assert said == {"*IDN?"}
