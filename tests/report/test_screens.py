"""Screens: their width, their next command, hostile names, large letters, and what they say."""

from __future__ import annotations

import re
import shlex
import unicodedata
from collections.abc import Callable
from contextlib import redirect_stderr, redirect_stdout
from functools import cache
from io import StringIO
from pathlib import Path

import click
import numpy as np
import pytest
from captures import (
    DESIGN,
    T_HIGH_S,
    T_LOW_S,
    node_v,
    sample_times,
    square_edges,
    square_v,
    write_columns,
    write_flat,
    write_square,
)
from rich.cells import cell_len
from rich.console import Console

from benchtool.cli.main import main, program
from benchtool.report.commands import quoted
from benchtool.report.screen.blocks import draw_rows, draw_verdict
from benchtool.report.screen.letters import large
from benchtool.report.text import printable, spelled

Show = Callable[..., str]
HOSTILE = "mist\x1b[31m\x07\r\n[bold]x[/bold]\u202e{evil}"


@pytest.fixture(scope="module")
def boards(tmp_path_factory: pytest.TempPathFactory) -> dict[str, str]:
    """Captures and designs by short names."""
    folder = tmp_path_factory.mktemp("boards")
    (folder / "mist.toml").write_text(DESIGN, encoding="utf-8")
    times_s = sample_times()
    edges_s = square_edges(8)
    wave, supply = square_v(times_s, edges_s), np.full_like(times_s, 12.0)
    paths = {
        "GOOD": write_square(folder / "good.csv"),
        "LOW": write_square(folder / "low.csv", t_high_s=0.8 * T_HIGH_S, t_low_s=0.8 * T_LOW_S),
        "NEAR": write_square(folder / "near.csv", t_high_s=12.45, t_low_s=9.55),
        "PULSE": write_square(folder / "pulse.csv", t_high_s=3.5, t_low_s=21.2),
        "EVEN": write_square(folder / "even.csv", t_high_s=12.0, t_low_s=12.4),
        "STUCK": write_flat(folder / "stuck.csv", 12.0),
        "SHORT": write_square(folder / "short.csv", n_samples=200),
        "NODE": write_columns(folder / "node.csv", times_s, {"NODE": node_v(times_s, edges_s)}),
        "BOTH": write_columns(folder / "both.csv", times_s, {"OUT": wave, "VCC": supply}),
        "TWO": write_columns(folder / "two.csv", times_s, {"OUT": wave, "PUMP 2": wave[::-1]}),
        "MANY": write_columns(
            folder / "many.csv", times_s[:300], {f"Channel {i:03}": wave[:300] for i in range(70)}
        ),
        "DESIGN": folder / "mist.toml",
    }
    return {name: str(path) for name, path in paths.items()}


SCREENS = [
    "look GOOD",
    "look BOTH GOOD",
    "look TWO",
    "look MANY",
    "look NODE",
    "look STUCK",
    "measure GOOD --budget",
    "measure PULSE",
    "measure EVEN",
    "measure NODE",
    "measure GOOD --baseline LOW --budget",
    "solve GOOD --design DESIGN",
    "solve LOW --topology astable --known RB=330k",
    "solve --topology astable --high 14.01s --low 10.75s --first 22.20s",
    "judge GOOD --design DESIGN",
    "judge LOW --design DESIGN",
    "judge NEAR --design DESIGN",
    "judge STUCK --design DESIGN",
    "judge SHORT --design DESIGN",
    "design check DESIGN",
    "design show DESIGN",
    "design limits DESIGN --expect 0.1%",
    "parts marking 103 472 X7R 50V yellow violet red gold",
    "explain guard band",
    "explain sensitivity",
    "explain",
]


@pytest.fixture(scope="module")
def show(boards: dict[str, str]) -> Show:
    """Run a command line of short names at a width, and return its screen; each runs once."""

    @cache
    def run(line: str, columns: int) -> str:
        out, err = StringIO(), StringIO()
        with pytest.MonkeyPatch.context() as patch, redirect_stdout(out), redirect_stderr(err):
            patch.setenv("COLUMNS", str(columns))
            main([boards.get(word, word) for word in line.split()])
        assert err.getvalue() == ""
        return out.getvalue()

    return lambda line, columns=80: run(line, columns)


@pytest.mark.parametrize("columns", [80, 120])
@pytest.mark.parametrize("line", SCREENS)
def test_no_line_is_wider_than_the_terminal(show: Show, line: str, columns: int) -> None:
    lines = show(line, columns).splitlines()
    assert len(lines) > 4
    wide = [text for text in lines if cell_len(text) > columns and "Next:" not in text]
    assert wide == []
    assert [text for text in lines if text != text.rstrip()] == []


def parse(arguments: list[str]) -> click.Context:
    """Take a command line apart as the program would, without running it."""
    group: click.Group = program
    context = click.Context(program, info_name="benchtool")
    while True:
        _, command, rest = group.resolve_command(context, arguments)
        assert command is not None
        if not isinstance(command, click.Group):
            return command.make_context(command.name, rest, parent=context)
        group, arguments = command, rest


@pytest.mark.parametrize("line", SCREENS)
def test_every_screen_ends_with_one_command_that_can_be_copied(show: Show, line: str) -> None:
    lines = show(line).rstrip("\n").splitlines()
    assert sum(text.startswith("  Next:  ") for text in lines) == 1
    program_name, *arguments = shlex.split(lines[-1].removeprefix("  Next:  "))
    assert program_name == "benchtool"
    try:
        parse(arguments)
    except click.exceptions.Exit:  # a command that shows its help
        assert "--help" in arguments


@pytest.mark.parametrize(
    ("line", "command"),
    [
        ("look GOOD", "benchtool measure GOOD"),
        ("look BOTH GOOD", "benchtool measure BOTH"),
        ("look TWO", "benchtool measure TWO --channel OUT"),
        ("look STUCK", "benchtool explain no-interval"),
        ("measure GOOD", "benchtool solve GOOD --topology astable"),
        ("measure PULSE", "benchtool solve PULSE --topology one-shot"),
        ("measure EVEN", "benchtool solve EVEN --topology output-fed"),
        ("solve GOOD --design DESIGN", "benchtool judge GOOD --design DESIGN"),
        ("judge GOOD --design DESIGN", "benchtool judge GOOD --design DESIGN --report board.html"),
        ("judge LOW --design DESIGN", "benchtool solve LOW --design DESIGN"),
        ("judge STUCK --design DESIGN", "benchtool look STUCK"),
        ("judge SHORT --design DESIGN", "benchtool look SHORT"),
    ],
)
def test_the_next_command_leads_on_and_works(
    show: Show, boards: dict[str, str], line: str, command: str
) -> None:
    last = show(line).rstrip("\n").splitlines()[-1].removeprefix("  Next:  ")
    assert shlex.split(last) == [boards.get(word, word) for word in command.split()]
    words = [word for word in shlex.split(last)[1:] if word not in ("--report", "board.html")]
    assert main(words) in (0, 1)


def test_a_verdict_is_said_at_the_top_and_at_the_end(show: Show) -> None:
    out = show("judge LOW --design DESIGN")
    lines = [line.strip() for line in out.splitlines() if line.strip()]
    assert "FAIL" in lines[:4]
    assert lines[-2] == "The board: FAIL"


def test_each_check_that_does_not_pass_says_why_once(show: Show) -> None:
    words = " ".join(show("judge LOW --design DESIGN").split())
    for name in ("period", "high time", "low time"):
        assert len(re.findall(rf"The {name}, [^.]*\.[^.]*\S* s ± ", words)) == 1, name
    assert "The duty" not in words


def test_an_undecided_board_says_what_would_settle_it(show: Show) -> None:
    words = " ".join(show("judge NEAR --design DESIGN").split())
    assert re.search(r"about \d+ more periods would settle it|more periods would not", words)


def test_a_dead_board_says_what_is_seen_and_what_it_may_be(show: Show) -> None:
    words = " ".join(show("judge STUCK --design DESIGN").split())
    assert "The output stays high at 12 V" in words
    assert "May be: C-short" in words
    assert "R-open" not in words.replace("RA-open", "").replace("RB-open", "")
    assert "[stuck-high]" in words


def test_looking_shows_every_point_with_its_evidence(show: Show) -> None:
    out = show("look GOOD")
    assert re.search(r"^  structure +found +how sure +from$", out, re.MULTILINE)
    assert re.search(r"delimiter +, +measured +\S+", out)
    assert re.search(r"unit of time +s +stated +header 'Time \(s\)'", out)
    assert re.search(r"interval +[\d.]+ m?s +measured", out)
    assert "OUT: output" in out
    assert re.search(r"levels .*12.* V", out)


def test_a_budget_adds_up_and_names_k(show: Show) -> None:
    out = show("measure GOOD --budget")
    block = out[out.index("\n  period   2") :].split("\n\n")[0]
    shares = [int(share) for share in re.findall(r"(\d+) %", block.split("contribution")[1])]
    assert sum(shares[:-1]) == pytest.approx(100, abs=2)  # each is rounded; the last is the 95 %
    assert re.search(r"U = \d\.\d\d·u at 95 %", block)


def test_budgets_come_after_the_figures_and_before_the_next_command(show: Show) -> None:
    out = show("measure GOOD --budget")
    assert out.index("good.csv") < out.index("contribution") < out.index("Next:")


def test_the_limit_in_use_has_the_arrow(show: Show) -> None:
    out = show("design limits DESIGN")
    blocks = {block.split()[0]: block for block in out.split("\n\n") if "worst-case" in block}
    arrows = {name: re.findall(r"-> +(\S+)", block) for name, block in blocks.items()}
    assert arrows["period"] == ["stated"]
    assert arrows["t_high"] == ["worst-case"]
    assert arrows["frequency"] == []
    assert "not judged" in blocks["frequency"]


def test_a_name_in_words_is_not_said_twice(show: Show) -> None:
    for line in ("design limits DESIGN", "measure GOOD --budget", "judge GOOD --design DESIGN"):
        assert not re.search(r"\b(period|duty|frequency) +\1\b", show(line))


def harmless(text: str) -> bool:
    return all(char == "\n" or unicodedata.category(char)[0] != "C" for char in text)


def test_hostile_channel_and_file_names_do_nothing(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    name = "mist\x1b]0;owned\x07[bold]x[/bold]\u202e"
    folder = tmp_path / "a\x1b[2Jb\nc"
    folder.mkdir()
    path = write_square(folder / "capture.csv", channel=name)
    for verb in ("look", "measure"):
        assert main([verb, str(path)]) == 0
        out, _ = capsys.readouterr()
        assert harmless(out)
        assert "[bold]x[/bold]" in out
        assert "\\x1b" in out


def test_hostile_words_of_a_design_do_nothing(
    good: Path, design: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    escaped = "drawing \\u001b[31m\\u202e [red]sheet[/red]"
    design.write_text(
        DESIGN.replace("drawing GH-MV-07 sheet 4", escaped).replace("Mist valve", "\\u001b[5mMist")
    )
    for words in (["judge", str(good), "--design"], ["design", "show"], ["design", "limits"]):
        assert main([*words, str(design)]) == 0
        out, _ = capsys.readouterr()
        assert harmless(out)
        assert "[red]sheet[/red]" in out
        assert "\\x1b[31m" in out


def test_hostile_arguments_are_shown_harmlessly(capsys: pytest.CaptureFixture[str]) -> None:
    for words in (
        [HOSTILE],
        ["look", HOSTILE],
        ["explain", HOSTILE],
        ["parts", "marking", HOSTILE],
    ):
        assert main(words) == 2
        _, err = capsys.readouterr()
        assert harmless(err)


def test_printable_leaves_text_as_it_is() -> None:
    assert printable("Größe 47 µF ± 5 % 電") == "Größe 47 µF ± 5 % 電"
    assert printable(HOSTILE) == r"mist\x1b[31m\x07\x0d\x0a[bold]x[/bold]\x202e{evil}"
    assert printable("a\u2028b") == r"a\x2028b"


def test_spelled_changes_only_what_the_encoding_lacks() -> None:
    text = "4.7 kΩ ± 5 %, 47 µF"
    assert spelled(text, "utf-8") == text
    assert spelled(text, "latin-1") == "4.7 kohm ± 5 %, 47 µF"
    assert spelled(text, "ascii") == "4.7 kohm +/- 5 %, 47 uF"
    assert spelled("電", "ascii") == "\\u96fb"


@pytest.mark.parametrize(
    ("name", "word"),
    [
        ("a.csv", "a.csv"),
        ("mist 07.csv", "'mist 07.csv'"),
        ("-o.csv", "./-o.csv"),
        ("-", "FILE"),
        ("a;rm b", "'a;rm b'"),
        ("it's", "'it'\"'\"'s'"),
    ],
)
def test_a_file_name_in_a_command_is_one_harmless_word(name: str, word: str) -> None:
    assert quoted(name) == word


class Encoded(StringIO):
    """A stream that says which letters it has."""

    def __init__(self, encoding: str) -> None:
        super().__init__()
        self._encoding = encoding

    @property
    def encoding(self) -> str:  # type: ignore[override]
        """Name of the encoding."""
        return self._encoding


@pytest.mark.parametrize(
    ("terminal", "encoding", "blocks"),
    [(True, "utf-8", True), (True, "ascii", False), (False, "utf-8", False)],
)
def test_large_letters_need_a_terminal_that_has_them(
    terminal: bool, encoding: str, blocks: bool
) -> None:
    stream = Encoded(encoding)
    drawn = Console(file=stream, width=80, force_terminal=terminal, color_system=None)
    draw_verdict(drawn, "pass", "All is well.")
    assert ("█" in stream.getvalue()) is blocks
    assert ("PASS" in stream.getvalue()) is not blocks


@pytest.mark.parametrize(
    "word", ["pass", "fail", "undecided", "unusable", "conditional-pass", "conditional-fail"]
)
def test_every_verdict_has_its_large_word_within_80_columns(word: str) -> None:
    rows = large(word)
    assert len({len(row) for row in rows}) == 1
    assert len(rows[0]) <= 76
    assert len(rows) == (1 if "-" in word else 3)
    if len(rows) == 1:
        assert rows[0].replace(" ", "") == word.upper()


def test_columns_stay_in_line_whatever_they_hold() -> None:
    stream = StringIO()
    drawn = Console(file=stream, width=60, color_system=None)
    draw_rows(drawn, [("a", "x" * 90, "evidence " * 8), ("b", "電電", "short")])
    lines = stream.getvalue().splitlines()
    assert max(cell_len(line) for line in lines) <= 60
    assert "".join(re.findall("x+", stream.getvalue())) == "x" * 90
    at = [line.index("evidence") for line in lines if "evidence" in line]
    assert len(set(at)) == 1
    last = lines[-1]
    assert cell_len(last[: last.index("short")]) == at[0]


@pytest.mark.parametrize("rows", [[], [("only",)]])
def test_no_rows_and_one_column_are_drawn(rows: list[tuple[str, ...]]) -> None:
    stream = StringIO()
    draw_rows(Console(file=stream, width=60), rows, heads=("head",))
    assert stream.getvalue().split() == (["head", "only"] if rows else [])


def test_more_traces_than_a_screen_holds_are_counted(show: Show) -> None:
    out = show("look MANY")
    assert len(re.findall(r"^  Channel \d+: ", out, re.MULTILINE)) == 64
    assert "6 more traces" in " ".join(out.split())  # wrapped where the path is long
