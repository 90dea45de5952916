"""The line of progress: on a terminal alone, for what takes long alone, and gone at the end."""

from __future__ import annotations

import io
import os
import pty
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest
from captures import write_square
from running import run_apart

from benchtool.cli import progress
from benchtool.cli.main import main
from benchtool.cli.progress import Progress, progress_line
from benchtool.model.watching import tell

CLEAN = {"PYTHONIOENCODING": "utf-8", "TERM": "xterm", "COLUMNS": "80"}


class Terminal(io.StringIO):
    """A terminal that remembers what it was sent."""

    def isatty(self) -> bool:
        """Say what a terminal says."""
        return True

    def screen(self) -> str:
        """Return what stands in the last line after all returns."""
        line = ""
        for part in self.getvalue().split("\n")[-1].split("\r"):
            line = part + line[len(part) :]
        return line.rstrip()


@pytest.fixture
def clock(monkeypatch: pytest.MonkeyPatch) -> list[float]:
    """A clock that is set by hand."""
    now_s = [100.0]
    monkeypatch.setattr(progress.time, "monotonic", lambda: now_s[0])
    return now_s


def test_nothing_is_drawn_within_the_first_second(clock: list[float]) -> None:
    terminal = Terminal()
    drawn = Progress(terminal)
    for done in range(10):
        drawn("reading", done, 10)
        clock[0] += 0.1
    assert terminal.getvalue() == ""


def test_share_rate_and_time_left_are_drawn_and_taken_away(clock: list[float]) -> None:
    terminal = Terminal()
    drawn = Progress(terminal)
    for megabytes in (0, 50, 100):
        drawn("reading", megabytes * 10**6, 400 * 10**6)
        clock[0] += 1.0
    assert "25% of 400 MB" in terminal.screen()
    assert "50 MB/s, 6 s left" in terminal.screen()
    drawn("reading", 400 * 10**6, 400 * 10**6)
    assert terminal.screen() == ""


def test_it_is_drawn_five_times_a_second_at_most(clock: list[float]) -> None:
    terminal = Terminal()
    drawn = Progress(terminal)
    for done in range(1000):  # ten seconds, the first of them silent
        drawn("measuring", done, 1000)
        clock[0] += 0.01
    assert 40 <= terminal.getvalue().count("measuring") <= 46


@pytest.mark.parametrize("left_s", [5, 500, 50_000, 500_000])
def test_the_line_fits_a_terminal(left_s: int) -> None:
    line = progress_line("measuring", 10**9, 10**9 + left_s * 10**7, 1e7)
    assert len(line) < 80
    assert line.endswith("left")


def test_a_run_on_a_terminal_leaves_no_trace(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    path = write_square(tmp_path / "a.csv", n_samples=20_000)
    terminal = Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)
    monkeypatch.setattr(progress, "LEAST_S", -1.0)
    monkeypatch.setattr(progress, "_EVERY_S", 0.0)
    monkeypatch.setattr("benchtool.formats.text.walking.BLOCK_BYTES", 1 << 12)
    assert main(["measure", str(path)]) == 0
    assert "reading" in terminal.getvalue()
    assert terminal.screen() == ""
    sent = len(terminal.getvalue())
    assert main(["measure", str(path), "--quiet"]) == 0
    assert len(terminal.getvalue()) == sent


@pytest.mark.parametrize("by_hand", [True, False])
def test_a_walk_given_up_leaves_no_line(
    monkeypatch: pytest.MonkeyPatch, clock: list[float], by_hand: bool
) -> None:
    terminal = Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)
    with progress.progress_shown():
        for done in range(3):
            tell("reading", done, 100)
            clock[0] += 1.0
        assert "reading" in terminal.screen()
        if by_hand:
            progress.make_room()
            assert terminal.screen() == ""
    assert terminal.screen() == ""
    tell("reading", 5, 100)  # nobody watches any more
    assert terminal.screen() == ""


def test_a_pipe_is_told_nothing(good: Path) -> None:
    assert run_apart("measure", good).err == ""


def big_file(path: Path) -> Path:
    """Write 40 MB whose rows all differ in form: some seconds of work."""
    rows = "".join(
        f"{i * 1e-6:.9g},{(i % 2000 > 999) * 12 + i % 7 / 8:.6g}\n" for i in range(10**5)
    )
    with path.open("w") as file:
        file.write("time_s,OUT (V)\n")
        for k in range(20):
            file.write(rows.replace("\n", f"{k}\n"))
    return path


def test_ctrl_c_ends_with_a_word_and_130(tmp_path: Path) -> None:
    path = big_file(tmp_path / "a.csv")
    report, table = tmp_path / "out.html", tmp_path / "out.csv"
    leader, follower = pty.openpty()
    command = [sys.executable, "-m", "benchtool", "measure", str(path), "--report", str(report)]
    process = subprocess.Popen(
        [*command, "--intervals", str(table)],
        stdin=follower,
        stdout=follower,
        stderr=follower,
        start_new_session=True,
        preexec_fn=lambda: _take_terminal(follower),  # noqa: PLW1509 - no thread runs here
        env={**os.environ, **CLEAN, "TMPDIR": str(tmp_path)},
    )
    os.close(follower)
    time.sleep(0.2)
    while process.poll() is None and not _holds_open(process.pid, path):
        time.sleep(0.01)
    os.write(leader, b"\x03")  # the terminal itself sends the signal
    sent = b""
    while chunk := _read(leader):
        sent += chunk
    assert process.wait(30) == 130
    os.close(leader)
    assert b"interrupted" in sent
    assert b"Traceback" not in sent
    assert sorted(entry.name for entry in tmp_path.iterdir()) == ["a.csv"]


def _take_terminal(follower: int) -> None:
    import fcntl
    import termios

    fcntl.ioctl(follower, termios.TIOCSCTTY, 0)
    signal.signal(signal.SIGINT, signal.default_int_handler)


def _holds_open(pid: int, path: Path) -> bool:
    folder = Path(f"/proc/{pid}/fd")
    if not folder.exists():
        pytest.skip("open files of a process are seen under /proc alone")
    try:
        return any(entry.resolve() == path for entry in folder.iterdir())
    except OSError:
        return False


def _read(leader: int) -> bytes:
    try:
        return os.read(leader, 65536)
    except OSError:  # the other end is closed
        return b""
