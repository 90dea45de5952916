"""Where results go: files whole or not at all, standard input, quiet runs, reports, intervals."""

from __future__ import annotations

import csv
import json
import os
import stat
from pathlib import Path

import pytest
from captures import write_flat, write_square
from running import run_apart, run_here

from benchtool.cli.output import write_file

Capsys = pytest.CaptureFixture[str]


def names_in(folder: Path) -> set[str]:
    return {path.name for path in folder.iterdir()}


def test_o_writes_the_screen_to_a_file(capsys: Capsys, tmp_path: Path, good: Path) -> None:
    ran = run_here(capsys, "measure", good, "-o", tmp_path / "screen.txt")
    assert (ran.code, ran.out, ran.err) == (0, "", "")
    text = (tmp_path / "screen.txt").read_text("utf-8")
    assert "t_high" in text
    assert "\x1b" not in text


def test_o_writes_the_document_to_a_file(capsys: Capsys, tmp_path: Path, good: Path) -> None:
    ran = run_here(capsys, "measure", good, "--json", "-o", tmp_path / "out.json")
    assert (ran.code, ran.out) == (0, "")
    assert json.loads((tmp_path / "out.json").read_text())["command"] == "measure"


def test_o_dash_is_the_screen(capsys: Capsys, good: Path) -> None:
    assert "t_high" in run_here(capsys, "measure", good, "-o", "-").out


def test_o_leaves_an_existing_file_as_it_is(capsys: Capsys, tmp_path: Path, good: Path) -> None:
    kept = tmp_path / "kept.txt"
    kept.write_text("precious")
    ran = run_here(capsys, "measure", good, "-o", kept)
    assert ran.code == 2
    assert "benchtool explain file-exists" in ran.err
    assert "--force" in ran.err
    assert kept.read_text() == "precious"
    assert run_here(capsys, "measure", good, "-o", kept, "--force").code == 0
    assert "t_high" in kept.read_text("utf-8")


@pytest.mark.parametrize("option", ["--report", "--intervals"])
def test_other_files_are_kept_too(capsys: Capsys, tmp_path: Path, good: Path, option: str) -> None:
    kept = tmp_path / "kept.txt"
    kept.write_text("precious")
    ran = run_here(capsys, "measure", good, option, kept, "--json")
    assert (ran.code, ran.document["error"]["code"]) == (2, "file-exists")
    assert kept.read_text() == "precious"


def test_a_failed_write_leaves_no_trace(
    capsys: Capsys, tmp_path: Path, good: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    old = tmp_path / "out.txt"
    old.write_text("precious")
    before = names_in(tmp_path)

    def refuse(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(Path, "replace", refuse)
    ran = run_here(capsys, "measure", good, "-o", old, "--force")
    assert ran.code == 2
    assert "benchtool explain not-writable" in ran.err
    assert old.read_text() == "precious"
    assert names_in(tmp_path) == before


def test_an_error_writes_no_file(capsys: Capsys, tmp_path: Path) -> None:
    flat = write_flat(tmp_path / "flat.csv", 12.0)
    target = tmp_path / "out.txt"
    assert run_here(capsys, "measure", flat, "-o", target, "--report", target).code == 4
    assert names_in(tmp_path) == {"flat.csv"}


@pytest.mark.parametrize("place", ["no/such/folder/out.txt", "."])
def test_a_place_that_cannot_be_written(
    capsys: Capsys, tmp_path: Path, good: Path, place: str
) -> None:
    ran = run_here(capsys, "measure", good, "-o", tmp_path / place, "--force", "--json")
    assert (ran.code, ran.document["error"]["code"]) == (2, "not-writable")


def test_a_file_gets_the_permissions_of_the_day(tmp_path: Path) -> None:
    old = os.umask(0o027)
    try:
        write_file(tmp_path / "out.txt", b"x", force=False)
    finally:
        os.umask(old)
    assert stat.S_IMODE((tmp_path / "out.txt").stat().st_mode) == 0o640


def test_a_link_stays_a_link(tmp_path: Path) -> None:
    (tmp_path / "real.txt").write_text("old")
    (tmp_path / "link.txt").symlink_to(tmp_path / "real.txt")
    write_file(tmp_path / "link.txt", b"new", force=True)
    assert (tmp_path / "link.txt").is_symlink()
    assert (tmp_path / "real.txt").read_text() == "new"


def test_a_pipe_is_written_to_and_stays_a_pipe(tmp_path: Path) -> None:
    """A test that names a device would replace the machine's own where it fails."""
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    reader = os.open(pipe, os.O_RDONLY | os.O_NONBLOCK)
    try:
        write_file(pipe, b"x", force=True)
        assert os.read(reader, 8) == b"x"
    finally:
        os.close(reader)
    assert pipe.is_fifo()


def test_quiet_prints_nothing_and_the_code_tells(
    capsys: Capsys, tmp_path: Path, good: Path, design: Path
) -> None:
    fast = write_square(tmp_path / "fast.csv", t_high_s=11.2, t_low_s=8.6)
    for path, code in ((good, 0), (fast, 1)):
        ran = run_here(capsys, "judge", path, "--design", design, "--quiet")
        assert (ran.code, ran.out, ran.err) == (code, "", "")


@pytest.mark.parametrize(
    "arguments",
    [
        ["look", "GOOD"],
        ["solve", "GOOD", "--topology", "astable"],
        ["design", "limits", "DESIGN"],
        ["design", "schema"],
        ["explain", "jitter"],
        ["parts", "marking", "103"],
        ["simulate", "DESIGN", "--rate", "20Hz", "--periods", "3", "-o", "NEW"],
    ],
    ids=lambda words: " ".join(words[:2]),
)
def test_quiet_holds_for_other_verbs(
    capsys: Capsys, tmp_path: Path, good: Path, design: Path, arguments: list[str]
) -> None:
    places = {"GOOD": str(good), "DESIGN": str(design), "NEW": str(tmp_path / "new.csv")}
    ran = run_here(capsys, *(places.get(word, word) for word in arguments), "--quiet")
    assert (ran.code, ran.out, ran.err) == (0, "", "")


def test_quiet_still_writes_the_file_and_the_document(
    capsys: Capsys, tmp_path: Path, good: Path
) -> None:
    run_here(capsys, "measure", good, "--quiet", "-o", tmp_path / "out.txt")
    assert "t_high" in (tmp_path / "out.txt").read_text("utf-8")
    assert run_here(capsys, "measure", good, "--quiet", "--json").document["results"]


def test_quiet_does_not_hide_an_error(capsys: Capsys) -> None:
    assert "does not exist" in run_here(capsys, "look", "none.csv", "--quiet").err


def test_a_capture_from_standard_input(capsys: Capsys, good: Path) -> None:
    piped = run_apart("measure", "-", "--json", given=good.read_bytes())
    named = run_here(capsys, "measure", good, "--json")
    assert piped.document["results"] == named.document["results"]
    assert piped.document["sources"][0]["name"] == "-"
    assert piped.document["sources"][0]["sha256"] == named.document["sources"][0]["sha256"]


def test_standard_input_is_not_in_the_next_command(good: Path) -> None:
    ran = run_apart("measure", "-", given=good.read_bytes())
    assert "Next:  benchtool solve FILE --topology astable" in ran.out


def test_nothing_on_standard_input() -> None:
    ran = run_apart("look", "-", "--json")
    assert (ran.code, ran.document["error"]["code"]) == (4, "empty-file")


@pytest.mark.parametrize(
    ("suffix", "begins"), [(".html", "<!doctype html>"), (".md", "#"), (".txt", "")]
)
@pytest.mark.parametrize("verb", ["look", "measure", "solve", "judge"])
def test_report_writes_a_page(
    capsys: Capsys, tmp_path: Path, good: Path, design: Path, suffix: str, begins: str, verb: str
) -> None:
    page = tmp_path / f"page{suffix}"
    more = ("--design", design) if verb in ("solve", "judge") else ()
    ran = run_here(capsys, verb, good, *more, "--report", page)
    assert ran.code == 0
    assert "Next:" in ran.out
    text = page.read_text("utf-8")
    assert text.lower().startswith(begins)
    assert good.name in text


def test_report_and_document_go_together(
    capsys: Capsys, tmp_path: Path, good: Path, design: Path
) -> None:
    page = tmp_path / "page.md"
    ran = run_here(capsys, "judge", good, "--design", design, "--report", page, "--json")
    assert ran.document["verdict"] == "pass"
    assert page.exists()


def test_intervals_are_a_table_of_what_was_measured(
    capsys: Capsys, tmp_path: Path, good: Path
) -> None:
    table = tmp_path / "intervals.csv"
    ran = run_here(capsys, "measure", good, "--intervals", table, "--json")
    with table.open() as file:
        rows = list(csv.DictReader(file))
    assert rows[0].keys() == {"kind", "start_s", "duration_s"}
    periods = [float(row["duration_s"]) for row in rows if row["kind"] == "period"]
    timing = ran.document["results"][0]["timing"]
    assert len(periods) == timing["period"]["n"]
    assert sum(periods) / len(periods) == pytest.approx(timing["period"]["value"], rel=1e-9)
    starts = [float(row["start_s"]) for row in rows if row["start_s"]]
    assert starts == sorted(starts)
    assert starts[0] == pytest.approx(3.0, abs=0.05)  # the first edge, to a sample
    cut = [(row["kind"], float(row["duration_s"])) for row in rows if not row["start_s"]]
    assert cut[0] == ("cut-low", pytest.approx(3.0, abs=0.05))
    assert len(cut) == 2


def test_a_dash_names_no_file_of_intervals(
    capsys: Capsys, tmp_path: Path, good: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    assert run_here(capsys, "measure", good, "--intervals", "-").code == 2
    assert names_in(tmp_path) == {"good.csv"}


def test_simulate_writes_capture_and_truth(capsys: Capsys, tmp_path: Path, design: Path) -> None:
    made = tmp_path / "made.csv"
    arguments = ("simulate", design, "--rate", "20Hz", "--periods", "4", "-o", made)
    ran = run_here(capsys, *arguments)
    assert (ran.code, ran.out) == (0, "")
    assert f"Next:  benchtool look {made}" in ran.err
    assert json.loads((tmp_path / "made.csv.truth.json").read_text())
    assert run_here(capsys, "judge", made, "--design", design).code == 0


def test_simulate_spoils_nothing_where_the_truth_is_in_the_way(
    capsys: Capsys, tmp_path: Path, design: Path
) -> None:
    truth = tmp_path / "made.csv.truth.json"
    truth.write_text("precious")
    made = tmp_path / "made.csv"
    ran = run_here(capsys, "simulate", design, "--rate", "20Hz", "--periods", "4", "-o", made)
    assert ran.code == 2
    assert truth.read_text() == "precious"
    assert not made.exists()


def test_design_new_makes_a_design_that_judges(capsys: Capsys, tmp_path: Path, good: Path) -> None:
    path = tmp_path / "new.toml"
    ran = run_here(
        capsys,
        *("design", "new", "--name", "Mist valve timer", "--topology", "astable"),
        *("--RA", "100k 1%", "--RB", "330k 1%", "--C", "47u 10%", "--supply", "12 V 5%"),
        *("--channel", "OUT", "--limit", "period=25 s 10%", "-o", path),
    )
    assert (ran.code, ran.out) == (0, "")
    assert f"Next:  benchtool design check {path}" in ran.err
    assert run_here(capsys, "design", "check", path).code == 0
    assert run_here(capsys, "judge", good, "--design", path).code == 0


def test_design_new_says_what_is_missing_where_nobody_can_answer(
    capsys: Capsys, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("sys.stdin.isatty", lambda: False, raising=False)
    ran = run_here(capsys, "design", "new", "--name", "Mist", "--topology", "astable")
    assert ran.code == 2
    assert "--supply" in ran.err
