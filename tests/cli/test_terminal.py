"""What a terminal gets, a pipe, and a terminal with few letters."""

from __future__ import annotations

import io
import os
import pty
import re
import subprocess
import sys
from pathlib import Path

import pytest
from captures import write_square
from running import run_apart, run_here

from benchtool.cli.main import main
from benchtool.designs import load_design

Capsys = pytest.CaptureFixture[str]
COLOUR = re.compile(r"\x1b\[[0-9;]*m")


def run_on_terminal(*arguments: str | Path, **environment: str) -> str:
    """Run with a pseudo-terminal of 80 columns as stdout; return what it was sent."""
    leader, follower = pty.openpty()
    clean = {name: value for name, value in os.environ.items() if name != "NO_COLOR"}
    settings = {"TERM": "xterm-256color", "COLUMNS": "80", "PYTHONIOENCODING": "utf-8"}
    command = [sys.executable, "-m", "benchtool", *map(str, arguments)]
    with subprocess.Popen(
        command, stdout=follower, stderr=subprocess.PIPE, env={**clean, **settings, **environment}
    ) as process:
        os.close(follower)
        sent = b"".join(iter(lambda: _read(leader), b""))
        assert process.stderr is not None
        assert process.stderr.read() == b""
    os.close(leader)
    return sent.decode()


def _read(leader: int) -> bytes:
    try:
        return os.read(leader, 65536)
    except OSError:  # the other end is closed
        return b""


def test_a_terminal_gets_colour_and_large_letters(good: Path, design: Path) -> None:
    sent = run_on_terminal("judge", good, "--design", design)
    assert COLOUR.search(sent)
    assert "█▀▀▄" in sent  # the P of PASS


@pytest.mark.parametrize(
    ("more", "environment"), [(["--no-color"], {}), ([], {"NO_COLOR": "1"})], ids=["option", "env"]
)
def test_colour_can_be_refused(
    good: Path, design: Path, more: list[str], environment: dict[str, str]
) -> None:
    sent = run_on_terminal("judge", good, "--design", design, *more, **environment)
    assert not re.search(r"\x1b\[[0-9;]*3[0-7]", sent)  # weight is left, colour is not
    assert "█▀▀▄" in sent


def test_a_terminal_that_knows_no_colour(good: Path) -> None:
    assert "\x1b" not in run_on_terminal("measure", good, TERM="dumb")


def test_a_pipe_gets_neither_colour_nor_blocks(capsys: Capsys, good: Path, design: Path) -> None:
    out = run_here(capsys, "judge", good, "--design", design).out
    assert "\x1b" not in out
    assert "█" not in out
    assert "\n  PASS\n" in out


def test_a_pipe_stays_plain_where_colour_is_forced(
    capsys: Capsys, monkeypatch: pytest.MonkeyPatch, good: Path, design: Path
) -> None:
    monkeypatch.setenv("TERM", "xterm-256color")
    for name in ("FORCE_COLOR", "CLICOLOR_FORCE", "TTY_COMPATIBLE"):
        monkeypatch.setenv(name, "1")
    assert "\x1b" not in run_here(capsys, "judge", good, "--design", design).out


@pytest.mark.parametrize("encoding", ["ascii", "latin-1", "cp437"])
@pytest.mark.parametrize(
    "arguments",
    [
        ["look", "GOOD"],
        ["measure", "GOOD", "--budget"],
        ["judge", "GOOD", "--design", "DESIGN"],
        ["design", "show", "DESIGN"],
        ["explain", "sensitivity"],
    ],
    ids=lambda words: words[0],
)
def test_few_letters_are_no_reason_to_stop(
    monkeypatch: pytest.MonkeyPatch, good: Path, design: Path, arguments: list[str], encoding: str
) -> None:
    places = {"GOOD": str(good), "DESIGN": str(design)}
    out = run_encoded(monkeypatch, encoding, *(places.get(word, word) for word in arguments))
    lines = [line for line in out.splitlines() if "Next:" not in line]
    assert len(lines) > 5
    assert max(map(len, lines)) <= 80


def run_encoded(monkeypatch: pytest.MonkeyPatch, encoding: str, *arguments: str) -> str:
    """Run with a stdout of few letters, 80 columns wide; return what it was sent."""
    sent = io.BytesIO()
    monkeypatch.setattr(sys, "stdout", io.TextIOWrapper(sent, encoding=encoding))
    monkeypatch.setenv("COLUMNS", "80")
    assert main(arguments) == 0
    return sent.getvalue().decode(encoding)


def test_signs_that_ascii_lacks_are_spelled(
    monkeypatch: pytest.MonkeyPatch, good: Path, design: Path
) -> None:
    out = run_encoded(monkeypatch, "ascii", "solve", str(good), "--design", str(design))
    assert "24.770 s +/- 0.036 s" in out
    assert "47 uF" in out
    assert "330 kohm" in out
    assert "\\x" not in out


@pytest.mark.parametrize("environment", [{"PYTHONIOENCODING": "ascii"}, {"LC_ALL": "C"}])
def test_few_letters_in_a_process_of_its_own(
    good: Path, design: Path, environment: dict[str, str]
) -> None:
    command = [sys.executable, "-m", "benchtool", "judge", str(good), "--design", str(design)]
    settings = {**os.environ, **environment}
    done = subprocess.run(command, capture_output=True, env=settings, check=False)
    assert (done.returncode, done.stderr) == (0, b"")


def test_a_design_keeps_its_meaning_in_ascii(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    text = run_encoded(
        monkeypatch,
        "ascii",
        *("design", "new", "--name", "Mist", "--topology", "astable", "--supply", "12 V 5%"),
        *("--RA", "100k 1%", "--RB", "330k 1%", "--C", "47µ 10%"),
    )
    (tmp_path / "new.toml").write_text(text)
    assert load_design(tmp_path / "new.toml").stages[0].parts["C"].value == 47e-6


def test_an_error_is_readable_in_ascii() -> None:
    ran = run_apart("look", "µ.csv", environment={"PYTHONIOENCODING": "ascii"})
    assert ran.code == 2
    assert "does not exist" in ran.err


def test_the_width_follows_the_terminal(good: Path, design: Path) -> None:
    for width in ("80", "120"):
        sent = run_on_terminal("judge", good, "--design", design, "--no-color", COLUMNS=width)
        lines = [line for line in COLOUR.sub("", sent).splitlines() if "Next:" not in line]
        assert max(map(len, lines)) <= int(width)
    assert max(map(len, lines)) > 80


def test_version_names_the_libraries(capsys: Capsys) -> None:
    ran = run_here(capsys, "--version")
    first, *rest = ran.out.splitlines()
    assert ran.code == 0
    assert re.fullmatch(r"benchtool \d+\.\d+\.\d+", first)
    libraries = dict(line.split() for line in rest)
    assert libraries["python"] == sys.version.split()[0]
    assert libraries.keys() >= {"numpy", "scipy", "pydantic", "click", "rich"}


def test_help_stands_in_groups(capsys: Capsys) -> None:
    out = run_here(capsys, "--help").out
    headings = [out.index(title) for title in ("Saved captures", "Design and parts", "Reference")]
    assert headings == sorted(headings)
    for verb in ("look", "measure", "solve", "judge", "design", "parts", "simulate", "explain"):
        assert re.search(rf"^  {verb} +\S", out, re.MULTILINE)


@pytest.mark.parametrize(
    "verb",
    ["look", "measure", "solve", "judge", "simulate", "explain", "selftest", "parts marking"]
    + [f"design {name}" for name in ("new", "check", "show", "limits", "schema")],
)
def test_every_verb_has_its_help_and_the_common_options(capsys: Capsys, verb: str) -> None:
    ran = run_here(capsys, *verb.split(), "--help")
    assert ran.code == 0
    for option in ("--json", "-o ", "--quiet", "--no-color", "--force"):
        assert option in ran.out
    assert "\\b" not in ran.out  # click's mark of an example is not part of it


def test_measuring_verbs_share_their_options(capsys: Capsys) -> None:
    wanted = (
        *("--format", "--delimiter", "--decimal", "--time-unit", "--interval", "--rate"),
        *("--channel", "--active", "--level", "--timebase", "--probe", "--temperature"),
    )
    for verb in ("look", "measure", "solve", "judge"):
        out = run_here(capsys, verb, "--help").out
        assert [option for option in wanted if option not in out] == []


def test_reading_options_reach_the_reader(capsys: Capsys, tmp_path: Path) -> None:
    path = write_square(tmp_path / "capture.csv")
    path.write_text(path.read_text().replace("Time (s)", "Time"))
    plain, said = (
        run_here(capsys, "measure", path, *more, "--json") for more in ([], ["--time-unit", "ms"])
    )
    period_s = said.document["results"][0]["timing"]["period"]["value"]
    assert period_s == pytest.approx(24.77e-3, rel=1e-2)
    if plain.code == 0:  # a scale may be assumed, but never without a word
        codes = {notice["code"] for notice in plain.document["warnings"]}
        assert any(code.startswith("assumed-") for code in codes)
    else:
        assert "--time-unit" in plain.document["error"]["hint"]


def test_the_timebase_widens_the_uncertainty(capsys: Capsys, good: Path) -> None:
    def u_rel(*more: str) -> float:
        ran = run_here(capsys, "measure", good, "--json", *more)
        period = ran.document["results"][0]["timing"]["period"]
        return float(period["u"] / period["value"])

    assert u_rel("--timebase", "1%") == pytest.approx(0.01 / 3**0.5, rel=1e-2)  # half-width/√3
    assert u_rel() < 1e-3


def test_active_low_starts_the_period_at_the_falling_edge(
    capsys: Capsys, tmp_path: Path, good: Path
) -> None:
    for active, first_s in (("high", 3.0), ("low", 17.0)):  # the first edge of each kind
        table = tmp_path / f"{active}.csv"
        run_here(capsys, "measure", good, "--active", active, "--intervals", table)
        rows = [row.split(",") for row in table.read_text().splitlines()]
        starts = [float(start) for kind, start, _ in rows if kind == "period"]
        assert starts[0] == pytest.approx(first_s, abs=0.1)  # jitter and a sample
