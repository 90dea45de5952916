"""``benchtool watch``: documents into a pipe; keys, and a clean terminal, on a terminal."""

from __future__ import annotations

import json
import os
import pty
import select
import signal
import subprocess
import sys
import termios
import time
from collections.abc import Callable, Iterator
from importlib.resources import files
from pathlib import Path
from typing import Any

import jsonschema
import pytest
from running import Ran, run_apart, run_here
from watched_here import RESOURCE, played

from benchtool.cli.watch_audience import NO_KEYS
from benchtool.cli.watch_terminal import Keyboard
from benchtool.jobs import sources

sys.path.insert(0, str(Path(__file__).parents[1] / "jobs"))
from moving_boards import DESIGN

SCHEMA = json.loads((files("benchtool.report") / "document.schema.json").read_text("utf-8"))
VALIDATOR = jsonschema.Draft202012Validator(SCHEMA)
ENTERED, LEFT = b"\x1b[?1049h", b"\x1b[?1049l"
Watch = Callable[..., Ran]


@pytest.fixture
def quick(tmp_path: Path) -> Path:
    """The design of the quick board."""
    path = tmp_path / "quick.toml"
    path.write_text(DESIGN, encoding="utf-8")
    return path


@pytest.fixture
def watch(capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> Watch:
    """Watch played records into a pipe."""

    def run(*arguments: str | Path, n: int = 8) -> Ran:
        monkeypatch.setattr(sources, "open_stream", lambda _: played(n, 0.0))
        return run_here(capsys, "watch", RESOURCE, *arguments)

    return run


def documents(ran: Ran) -> list[dict[str, Any]]:
    return [json.loads(line) for line in ran.out.splitlines()]


def test_a_pipe_gets_one_document_a_capture(watch: Watch, quick: Path) -> None:
    found = documents(watch("--design", quick, "--updates", "7"))
    assert [doc["watch"]["update"] for doc in found] == list(range(1, 8))
    for doc in found:
        assert (doc["schema"], doc["command"]) == ("benchtool/1", "watch")
        assert doc.keys() >= {"version", "made_at", "sources", "results", "verdict", "rule"}
        assert doc["watch"].keys() >= {
            *("value", "goal", "distance", "distance_in_U", "moved", "age_s", "averaged_n"),
        }


def test_the_documents_keep_the_schema(watch: Watch, quick: Path) -> None:
    for more in ((), ("--design", quick), ("--goal", "40Hz"), ("--goal", "55%", "--json")):
        for doc in documents(watch(*more, "--updates", "2")):
            for source in doc["sources"]:
                source["sha256"] = "0" * 64  # simulated captures have no bytes to hash
            VALIDATOR.validate(doc)


def test_the_movement_and_the_distance_are_in_the_document(watch: Watch, quick: Path) -> None:
    found = [doc["watch"] for doc in documents(watch("--design", quick, "--updates", "7"))]
    assert [w["moved"] for w in found] == [False] * 5 + [True, False]
    assert found[4]["averaged_n"] > 4 * found[0]["averaged_n"] > found[5]["averaged_n"]
    last = found[-1]
    assert last["distance"] == pytest.approx(last["value"]["value"] - last["goal"]["value"])
    assert last["distance_in_U"] == pytest.approx(last["distance"] / last["value"]["U"])
    assert found[4]["heading"] == "unmoved"
    assert last["heading"] in ("there", "towards")


def test_the_verdict_of_the_last_update_is_the_exit_code(watch: Watch, quick: Path) -> None:
    assert watch("--design", quick, "--updates", "3").code == 1
    assert watch("--design", quick, "--updates", "7").code == 0
    assert watch("--updates", "3").code == 0


def test_a_lost_source_is_an_error_after_the_last_reading(watch: Watch) -> None:
    ran = watch("--json", n=2)
    assert ran.code == 5
    *before, last = documents(ran)
    assert len(before) == 2
    assert last["error"]["code"] == "not-connected"
    VALIDATOR.validate(last)


def test_quiet_prints_nothing(watch: Watch, quick: Path) -> None:
    ran = watch("--design", quick, "--updates", "2", "--quiet")
    assert (ran.code, ran.out) == (1, "")


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (("--goal", "25"), "--goal 25s"),
        (("--goal", "4 ohm"), "--goal 25s"),
        (("--goal", "-25s"), "--goal 25s"),
        (("--goal", "25s", "--quantity", "frequency"), "another --quantity"),
        (("--updates", "0"), "--help"),
    ],
)
def test_what_cannot_be_meant_is_refused(
    watch: Watch, arguments: tuple[str, ...], said: str
) -> None:
    ran = watch(*arguments)
    assert ran.code == 2
    assert said in ran.err


def test_a_file_that_exists_is_refused_before_the_watch_begins(
    watch: Watch, tmp_path: Path
) -> None:
    path = tmp_path / "kept.json"
    path.write_text("kept")
    ran = watch("-o", path, "--updates", "1")
    assert (ran.code, ran.out) == (2, "")
    assert path.read_text() == "kept"


def test_standard_input_is_followed_until_it_ends(good: Path, design: Path) -> None:
    """No source is played here: rows come through a pipe, as a logger would send them."""
    ran = run_apart("watch", "-", "--design", design, given=good.read_bytes())
    assert ran.code == 5
    assert "standard input has ended" in ran.err
    last = documents(ran)[-1]
    VALIDATOR.validate(last)
    assert last["watch"]["value"]["value"] == pytest.approx(24.76, rel=5e-3)  # 50 ms samples
    assert last["verdict"] == "pass"


def test_a_file_is_followed(good: Path) -> None:
    ran = run_apart("watch", good, "--goal", "25s", "--updates", "1", "--quiet", "--json")
    assert ran.code == 0, ran.err
    assert documents(ran)[0]["watch"]["goal"]["value"] == 25.0


class Session:
    """A watch on a terminal of its own, whose keys the test presses."""

    def __init__(self, *arguments: str | Path, n: int = 400, **environment: str) -> None:
        self.leader, self.follower = pty.openpty()
        self.before = termios.tcgetattr(self.follower)
        termios.tcsetwinsize(self.follower, (24, 80))
        clean = {k: v for k, v in os.environ.items() if k not in ("NO_COLOR", "COLUMNS", "LINES")}
        settings = {"TERM": "xterm-256color", "PYTHONIOENCODING": "utf-8", **environment}
        script = Path(__file__).parent / "watched_here.py"
        command = [sys.executable, script, str(n), "0.05", RESOURCE, *arguments]
        self.sent = b""
        self.process = subprocess.Popen(
            list(map(str, command)),
            stdin=self.follower,
            stdout=self.follower,
            stderr=subprocess.PIPE,
            env={**clean, **settings},
            start_new_session=True,
        )

    def until(self, text: bytes, *, within_s: float = 20.0) -> None:
        """Read what is drawn until a text comes."""
        end_s = time.monotonic() + within_s
        while text not in self.sent:
            assert time.monotonic() < end_s, self.sent[-2000:].decode(errors="replace")
            self._read(0.2)

    def press(self, keys: bytes) -> None:
        """Press keys."""
        os.write(self.leader, keys)

    def end(self) -> tuple[int, bytes]:
        """Return the exit code and what stderr got; all that was drawn is read."""
        end_s = time.monotonic() + 20
        while self.process.poll() is None and time.monotonic() < end_s:
            self._read(0.1)
        self._read(0.1)
        assert self.process.stderr is not None
        return self.process.wait(1), self.process.stderr.read()

    def close(self) -> None:
        """End what is left."""
        if self.process.poll() is None:
            self.process.kill()
            self.process.wait()
        if self.process.stderr:
            self.process.stderr.close()
        os.close(self.leader)
        os.close(self.follower)

    def _read(self, wait_s: float) -> None:
        if select.select([self.leader], [], [], wait_s)[0]:
            self.sent += os.read(self.leader, 65536)


@pytest.fixture
def on_terminal() -> Iterator[Callable[..., Session]]:
    """Begin watches on terminals of their own, and end them all."""
    begun: list[Session] = []

    def begin(*arguments: str | Path, **given: Any) -> Session:
        begun.append(Session(*arguments, **given))
        return begun[-1]

    yield begin
    for session in begun:
        session.close()


Begin = Callable[..., Session]


def test_a_reading_is_marked_and_accepted_by_keys(
    on_terminal: Begin, quick: Path, tmp_path: Path
) -> None:
    kept = tmp_path / "kept.json"
    session = on_terminal("--design", quick, "-o", kept)
    session.until(b"PASS")
    session.press(b"m")
    session.until(b"mark 1")
    session.press(b"a")
    code, _ = session.end()
    assert code == 0
    document = json.loads(kept.read_text())
    assert document["verdict"] == "pass"
    assert [mark["number"] for mark in document["watch"]["marks"]] == [1]
    after = session.sent.partition(LEFT)[2].decode()
    assert "accepted" in after
    assert "PASS" in after
    assert f"benchtool acquire {RESOURCE} -o board.npz" in after


@pytest.mark.parametrize(
    ("how", "code"), [("q", 0), ("interrupt", 130), ("terminate", 130), ("lost", 5)]
)
def test_the_terminal_is_left_as_it_was_found(
    on_terminal: Begin, quick: Path, how: str, code: int
) -> None:
    session = on_terminal("--design", quick, n=12 if how == "lost" else 400)
    session.until(b"average of")
    assert termios.tcgetattr(session.follower)[3] & termios.ECHO == 0
    if how == "q":
        session.press(b"q")
    elif how != "lost":
        number = signal.SIGINT if how == "interrupt" else signal.SIGTERM
        session.process.send_signal(number)
    found, err = session.end()
    assert found == code, err
    assert termios.tcgetattr(session.follower) == session.before
    assert session.sent.count(ENTERED) == session.sent.count(LEFT) == 1
    after = session.sent.partition(LEFT)[2]
    assert (b"last reading" in after) is (how == "lost")
    assert b"Traceback" not in err


def test_colour_can_be_refused(on_terminal: Begin, quick: Path) -> None:
    plain = on_terminal("--design", quick, NO_COLOR="1")
    plain.until(b"FAIL")
    coloured = on_terminal("--design", quick)
    coloured.until(b"FAIL")
    assert b"\x1b[1;31m" in coloured.sent
    assert b"31m" not in plain.sent
    assert b"\x1b[1m" in plain.sent  # weight is left


def test_the_tone_rings(on_terminal: Begin, quick: Path) -> None:
    session = on_terminal("--design", quick, "--tone")
    session.until(b"\a")
    silent = on_terminal("--design", quick)
    silent.until(b"average of")
    assert b"\a" not in silent.sent


def test_a_terminal_that_cannot_be_drawn_on_gets_lines(on_terminal: Begin, quick: Path) -> None:
    session = on_terminal("--design", quick, "--updates", "3", TERM="dumb")
    code, _ = session.end()
    assert code == 1
    assert b"\x1b" not in session.sent
    lines = session.sent.decode().splitlines()
    assert len(lines) == 3
    assert all("FAIL" in line and len(line) < 80 for line in lines)


def test_a_system_without_such_terminals_has_no_keys_and_says_so(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setitem(sys.modules, "termios", None)
    with Keyboard() as keyboard:
        assert not keyboard.works
        assert keyboard.pressed() == ""
    assert "Ctrl-C" in NO_KEYS


def test_few_letters_are_no_reason_to_stop(on_terminal: Begin, quick: Path) -> None:
    session = on_terminal("--design", quick, PYTHONIOENCODING="ascii")
    session.until(b"+/-")
    session.press(b"q")
    assert session.end()[0] == 0
    assert b"##" in session.sent
