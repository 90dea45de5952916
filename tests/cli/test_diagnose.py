"""Diagnosing a board from the command line."""

from __future__ import annotations

import shlex
from pathlib import Path

import numpy as np
import pytest
from running import run_here

SAMPLES = Path(__file__).parents[2] / "sample_captures"
DESIGN = SAMPLES / "mist_valve.toml"

Capsys = pytest.CaptureFixture[str]


def best(document: dict[str, object]) -> dict[str, object]:
    suspects: list[dict[str, object]] = document["results"][0]["suspects"]  # type: ignore[index]
    return suspects[0]


def odds_of(document: dict[str, object]) -> dict[str, float]:
    suspects: list[dict[str, object]] = document["results"][0]["suspects"]  # type: ignore[index]
    return {str(item["fault"]): float(str(item["probability"])) for item in suspects}


@pytest.mark.parametrize(
    ("name", "fault"),
    [
        ("c_20_percent_low.csv", "C-low"),
        ("leaky_c.csv", "C-leaky"),
        ("wrong_rb.txt", "RB-low"),
        ("good_board.csv", "healthy"),
    ],
)
def test_the_fault_that_was_put_in_is_the_first_suspect(
    name: str, fault: str, capsys: Capsys
) -> None:
    ran = run_here(capsys, "diagnose", SAMPLES / name, "--design", DESIGN, "--json")
    assert ran.code == 0
    assert best(ran.document)["fault"] == fault
    result = ran.document["results"][0]
    total = sum(suspect["probability"] for suspect in result["suspects"])
    assert total == pytest.approx(1, abs=1e-9)


def test_a_lifted_part_that_measures_as_marked_is_cleared(capsys: Capsys) -> None:
    given = ("diagnose", SAMPLES / "c_20_percent_low.csv", "--design", DESIGN, "--json")
    without = run_here(capsys, *given).document
    measured = run_here(capsys, *given, "--reading", "C=47uF").document
    assert best(without)["fault"] == "C-low"
    assert odds_of(measured)["C-low"] < 0.01


def test_a_board_that_stands_still_is_diagnosed(capsys: Capsys) -> None:
    given = ("diagnose", SAMPLES / "stuck_high.csv", "--design", DESIGN, "--json")
    ran = run_here(capsys, *given)
    assert ran.code == 0
    assert ran.document["results"][0]["stuck"] == "high"
    assert odds_of(ran.document)["control-high"] > 0.05
    dead = run_here(capsys, *given, "--reading", "node-level=0V").document
    # a node at 0 V is not charged: what keeps the IC from turning at a charged one is cleared
    assert odds_of(dead).get("control-high", 0.0) < 0.001
    assert odds_of(dead)["C-short"] > odds_of(ran.document)["C-short"]


def test_the_recorded_node_joins_the_evidence(capsys: Capsys) -> None:
    design = SAMPLES / "mist_valve_node.toml"
    given = ("diagnose", SAMPLES / "node_probed.csv", "--design", design, "--json")
    used = run_here(capsys, *given).document["results"][0]["used"]
    assert "the capacitor's trace" in used


def test_a_file_without_a_node_is_refused_as_one(capsys: Capsys) -> None:
    good = SAMPLES / "good_board.csv"
    ran = run_here(capsys, "diagnose", good, "--design", DESIGN, "--node", good)
    assert ran.code == 2
    assert "no trace of the capacitor node" in ran.err


def test_without_a_drawing_markings_do_and_what_is_assumed_is_said(capsys: Capsys) -> None:
    parts = ("--RA", "100k", "--RB", "330k", "--C", "47u 10%")
    board = SAMPLES / "wrong_rb.txt"
    ran = run_here(capsys, "diagnose", board, "--topology", "astable", *parts, "--json")
    assert best(ran.document)["fault"] == "RB-low"
    said = {warning["code"]: warning["text"] for warning in ran.document["warnings"]}
    assert "RA 100k 5%" in said["assumed-from-markings"]
    assert "C 47u" not in said["assumed-from-markings"]


def test_without_markings_the_sets_of_preferred_values_are_counted(capsys: Capsys) -> None:
    board = SAMPLES / "good_board.csv"
    ran = run_here(capsys, "diagnose", board, "--topology", "astable")
    assert ran.code == 0
    assert "RA 100 kΩ  RB 330 kΩ  C 47 µF" in ran.out
    found = run_here(capsys, "diagnose", board, "--topology", "astable", "--json").document
    first = found["results"][0]["combinations"]["best"][0]["parts"]
    assert first == pytest.approx({"RA": 100e3, "RB": 330e3, "C": 47e-6})


@pytest.mark.parametrize(
    ("options", "says"),
    [
        ((), "needs to know the circuit"),
        (("--design", DESIGN, "--topology", "astable"), "needs to know the circuit"),
        (("--topology", "astable", "--RA", "100k"), "needs RB and C as marked"),
        (("--design", DESIGN, "--reading", "pin5=8V"), "--reading"),
        (("--design", DESIGN, "--shunt", "2M2V", "x.csv"), "--shunt"),
        (("--design", DESIGN, "--heated", "Q1", "x.csv"), "--heated"),
        (("--design", DESIGN, "--power-up", "nowhere.csv"), "nowhere.csv"),
    ],
)
def test_what_is_missing_or_wrong_is_said_in_one_line(
    options: tuple[str | Path, ...], says: str, capsys: Capsys
) -> None:
    ran = run_here(capsys, "diagnose", SAMPLES / "good_board.csv", *options)
    assert ran.code == 2
    assert says in ran.err
    assert "Traceback" not in ran.err


def test_the_screen_names_hazards_before_what_to_do(capsys: Capsys) -> None:
    ran = run_here(capsys, "diagnose", SAMPLES / "leaky_c.csv", "--design", DESIGN)
    caution, doing = ran.out.index("Caution:"), ran.out.index("Record the capacitor's voltage")
    assert caution < doing
    assert "this board" in ran.out


@pytest.mark.parametrize("suffix", [".html", ".md", ".txt"])
def test_the_report_holds_suspects_and_what_to_measure_next(
    suffix: str, tmp_path: Path, capsys: Capsys
) -> None:
    report = tmp_path / f"board{suffix}"
    board = SAMPLES / "leaky_c.csv"
    run_here(capsys, "diagnose", board, "--design", DESIGN, "--report", report, "--quiet")
    text = report.read_text(encoding="utf-8")
    for words in ("C-leaky", "What to measure next", "Which way the times went", "Caution"):
        assert words in text


@pytest.mark.parametrize(
    "reading",
    [
        *("control-pin=0V", "control-pin=-5V", "supply=1e6V", "RB=0", "RB<=0", "RB<=-5"),
        *("C=47", "C=-1u", "temperature=5000degC", "discharge-pin=1000V"),
    ],
)
def test_a_reading_that_cannot_be_is_refused_as_a_slip(reading: str, capsys: Capsys) -> None:
    given = ("diagnose", SAMPLES / "good_board.csv", "--design", DESIGN)
    ran = run_here(capsys, *given, "--reading", reading)
    assert ran.code == 2
    assert "cannot be" in ran.err


def test_the_next_command_brings_the_earlier_evidence_again(capsys: Capsys) -> None:
    parts = ("--topology", "astable", "--RA", "100k", "--RB", "330k", "--C", "47u")
    board = SAMPLES / "leaky_c.csv"
    ran = run_here(capsys, "diagnose", board, *parts, "--reading", "supply=12V")
    command = ran.out[ran.out.index("Next:  ") + 7 :].strip()
    words = shlex.split(" ".join(command.split()))
    assert words[:3] == ["benchtool", "diagnose", str(board)]
    assert {"--topology", "--RA", "--RB", "--C", "supply=12V"} <= set(words)
    typed = [str(SAMPLES / "good_board.csv") if word == "FILE" else word for word in words[1:]]
    again = run_here(capsys, *typed)
    assert again.code in (0, 2), again.err  # 2 where the file holds no node
    assert "No such option" not in again.err


def test_a_caution_is_said_in_full_once(capsys: Capsys) -> None:
    ran = run_here(capsys, "diagnose", SAMPLES / "good_board.csv", "--design", DESIGN)
    said = " ".join(ran.out.split())
    assert said.count("an earth-referenced clip") == 1
    assert "The board is powered (as above)." in said


def test_a_dead_board_that_no_fault_explains_names_none(capsys: Capsys, tmp_path: Path) -> None:
    noise_v = np.random.default_rng(5).normal(0.03, 0.02, 3000)
    rows = "\n".join(f"{0.02 * k:.2f},{v:.3f}" for k, v in enumerate(noise_v))
    (tmp_path / "low.csv").write_text(f"Time (s),OUT (V)\n{rows}\n", encoding="utf-8")
    given = ("diagnose", tmp_path / "low.csv", "--design", DESIGN, "--reading", "node-level=0V")
    sentence = run_here(capsys, *given, "--json").document["results"][0]["sentence"]
    assert sentence.startswith("The output stays low. No fault of the list")
