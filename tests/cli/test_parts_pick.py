"""``parts pick`` as a user runs it."""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any

import pytest
from running import Ran, run_here

from benchtool.manual import lookup

Capsys = pytest.CaptureFixture[str]
OURS = ("--part", "RB", "--target", "period=25s")


def pick(capsys: Capsys, *arguments: str | Path) -> list[dict[str, Any]]:
    ran = run_here(capsys, "parts", "pick", *arguments, "--json")
    assert ran.code == 0, ran.out
    return ran.document["rows"]


def refusal(ran: Ran) -> dict[str, Any]:
    assert ran.code == 2
    return ran.document["error"]


def codes(rows: list[dict[str, Any]]) -> set[str]:
    return {item["code"] for item in rows[0]["warnings"]}


def test_a_plain_value_gets_ranked_candidates_with_value_and_spread(capsys: Capsys) -> None:
    rows = pick(capsys, "346k", "--to", "330k", "--series", "E24")
    assert [row["rank"] for row in rows] == list(range(1, len(rows) + 1))
    best = rows[0]
    assert (best["action"], best["added"]["value"]) == ("parallel", 7.5e6)
    value = 346e3 * 7.5e6 / (346e3 + 7.5e6)
    assert best["result"]["value"] == pytest.approx(value)
    assert best["off_rel"] == pytest.approx(value / 330e3 - 1)
    reading, pad = 0.5e3 / math.sqrt(3), 0.05 * 7.5e6 / math.sqrt(3)  # last digit, 5 %
    by_hand = math.hypot((value / 346e3) ** 2 * reading, (value / 7.5e6) ** 2 * pad)
    assert best["u"] == pytest.approx(by_hand)
    assert best["pass_share"] is None
    assert {"find-the-cause-first", "assumed-last-digit", "assumed-part-tolerance"} <= codes(rows)


def test_a_capacitor_is_told_by_its_value(capsys: Capsys) -> None:
    rows = pick(capsys, "44n", "--to", "47n", "--series", "E12")
    assert {row["kind"] for row in rows} == {"capacitor"}
    assert "parallel" in {row["action"] for row in rows}


def test_an_electrolytic_is_replaced_only(capsys: Capsys) -> None:
    rows = pick(capsys, "44u", "--to", "47u", "--kind", "electrolytic")
    assert {row["action"] for row in rows} == {"keep", "replace"}
    assert "electrolytic-not-trimmed" in codes(rows)


def test_the_stated_accuracy_of_a_reading_and_of_parts_is_used(capsys: Capsys) -> None:
    rows = pick(capsys, "346k 0.5%", "--to", "330k", "--tolerance", "2%", "--series", "E12")
    assert rows[0]["have"]["half_width"] == pytest.approx(0.005 * 346e3)
    pad = next(row for row in rows if row["action"] == "parallel")
    assert pad["added"]["half_width"] == pytest.approx(0.02 * pad["added"]["value"])
    assert not {"assumed-last-digit", "assumed-part-tolerance"} & codes(rows)


@pytest.mark.parametrize(("text", "half_rel"), [("4k7", 0.5 / 47), ("346k", 0.5 / 346)])
def test_a_reading_is_good_to_its_last_digit(capsys: Capsys, text: str, half_rel: float) -> None:
    rows = pick(capsys, text, "--to", "5k")
    have = rows[0]["have"]
    assert have["half_width"] == pytest.approx(half_rel * have["value"])


def test_a_design_gives_value_times_and_the_share_that_passes(capsys: Capsys, design: Path) -> None:
    rows = pick(capsys, "--design", design, *OURS, "--series", "E24", "--tolerance", "1%")
    assert rows[0]["part"] == "RB"
    # the ideal astable wants 333.7k; saturation, leakage and delays of the IC take some of it
    ideal = (25.0 / (47e-6 * math.log(2)) - 100e3) / 2
    assert rows[0]["wanted"] == pytest.approx(ideal, rel=0.02)
    assert all(0 <= row["pass_share"] <= 1 for row in rows)
    best = rows[0]
    assert best["expected"]["period"] == pytest.approx(25.0, rel=0.01)
    worst = min(rows, key=lambda row: row["pass_share"])
    assert worst["pass_share"] < best["pass_share"]
    assert abs(worst["off_rel"]) > abs(best["off_rel"])


def test_a_part_measured_out_of_tolerance_is_replaced_rather_than_trimmed(
    capsys: Capsys, design: Path
) -> None:
    rows = pick(capsys, "--design", design, *OURS, "--have", "RB=346k", "--series", "E24")
    assert (rows[0]["action"], rows[0]["added"]["value"]) == ("replace", 330e3)
    assert "trim-beyond-tolerance" in codes(rows)
    keep = next(row for row in rows if row["action"] == "keep")
    assert keep["have"]["value"] == 346e3


def test_another_part_as_measured_moves_the_value_wanted(capsys: Capsys, design: Path) -> None:
    marked = pick(capsys, "--design", design, *OURS)
    lower_c = pick(capsys, "--design", design, *OURS, "--have", "C=44u 1%")
    # a period goes with (RA + 2·RB)·C
    ratio = (100e3 + 2 * lower_c[0]["wanted"]) / (100e3 + 2 * marked[0]["wanted"])
    assert ratio == pytest.approx(47 / 44, rel=0.005)  # leakage weighs more on a smaller C


def test_an_electrolytic_of_the_design_is_not_trimmed(capsys: Capsys, design: Path) -> None:
    target = ("--part", "C", "--target", "period=23.5s")
    rows = pick(capsys, "--design", design, *target, "--series", "E24")
    assert {row["action"] for row in rows} == {"keep", "replace"}
    film = pick(capsys, "--design", design, *target, "--series", "E24", "--kind", "capacitor")
    assert "series" in {row["action"] for row in film}


def test_a_diagnosis_that_cannot_exclude_a_leak_is_named(
    capsys: Capsys, design: Path, tmp_path: Path
) -> None:
    path = tmp_path / "diagnosis.json"
    suspects = [{"fault": "C-leaky", "probability": 0.3}, {"fault": "RB-high", "probability": 0.6}]
    path.write_text(json.dumps({"results": [{"suspects": suspects}]}), "utf-8")
    rows = pick(capsys, "--design", design, *OURS, "--diagnosis", path)
    assert "trim-would-hide-a-leak" in codes(rows)
    assert "find-the-cause-first" not in codes(rows)
    suspects[0]["probability"] = 0.01
    path.write_text(json.dumps({"results": [{"suspects": suspects}]}), "utf-8")
    assert "trim-would-hide-a-leak" not in codes(
        pick(capsys, "--design", design, *OURS, "--diagnosis", path)
    )


def test_a_drift_in_the_diagnosis_is_named(capsys: Capsys, tmp_path: Path) -> None:
    path = tmp_path / "diagnosis.json"
    path.write_text(json.dumps({"results": [{"findings": [{"code": "drifting"}]}]}), "utf-8")
    rows = pick(capsys, "346k", "--to", "330k", "--diagnosis", path)
    assert "trim-would-hide-a-leak" in codes(rows)


@pytest.mark.parametrize("text", ["no json", "{}", '{"results": [{"suspects": [1]}]}', "[]"])
def test_a_file_that_is_no_diagnosis_is_refused(capsys: Capsys, tmp_path: Path, text: str) -> None:
    path = tmp_path / "diagnosis.json"
    path.write_text(text, "utf-8")
    ran = run_here(capsys, "parts", "pick", "1k", "--to", "2k", "--diagnosis", path, "--json")
    assert refusal(ran)["code"] == "no-diagnosis"


def test_a_target_outside_the_limits_is_told_and_ranked_by_nearness(
    capsys: Capsys, design: Path
) -> None:
    rows = pick(capsys, "--design", design, "--part", "RB", "--target", "period=32s")
    assert "target-outside-limits" in codes(rows)
    assert rows[0]["expected"]["period"] == pytest.approx(32.0, rel=0.01)


@pytest.mark.parametrize(
    ("arguments", "code"),
    [
        (("0.05", "--to", "1"), "which-kind"),
        (("346x", "--to", "330k"), "which-kind"),
        (("346k", "--to", "47u"), "which-kind"),
        (("346k",), "usage"),
        ((), "usage"),
        (("346k", "--to", "330k", "--part", "RB"), "usage"),
        (("346k", "--to", "-1", "--kind", "resistor"), "usage"),
        (("346k ?", "--to", "330k"), "unit"),
    ],
)
def test_half_a_question_is_refused(capsys: Capsys, arguments: tuple[str, ...], code: str) -> None:
    ran = run_here(capsys, "parts", "pick", *arguments, "--json")
    assert ran.code == 2
    assert ran.document["error"]["hint"]
    assert ran.document["error"]["code"] == code
    assert lookup(code) is not None


@pytest.mark.parametrize(
    "arguments",
    [
        ("--part", "RB"),
        ("--part", "RX", "--target", "period=25s"),
        ("--part", "RB", "--target", "period"),
        ("--part", "RB", "--target", "perod=25s"),
        ("--part", "RB", "--target", "period=25V"),
        ("--part", "RB", "--target", "period=25s", "--have", "RX=1k"),
        ("--part", "RB", "--target", "period=25s", "--have", "RB"),
        ("--part", "RB", "--target", "period=1s"),
        ("346k", "--part", "RB", "--target", "period=25s"),
        ("--part", "RB", "--target", "period=25s", "--stage", "drain"),
    ],
)
def test_a_question_that_does_not_fit_the_design_is_refused_with_a_hint(
    capsys: Capsys, design: Path, arguments: tuple[str, ...]
) -> None:
    ran = run_here(capsys, "parts", "pick", "--design", design, *arguments, "--json")
    assert refusal(ran)["hint"]


@pytest.mark.parametrize("plain", [True, False])
def test_the_screen_says_what_to_do_within_80_columns_and_ends_in_a_command(
    capsys: Capsys, design: Path, monkeypatch: pytest.MonkeyPatch, plain: bool
) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    ours = ("--design", design, *OURS, "--have", "RB=346k", "--series", "E24")
    ran = run_here(capsys, "parts", "pick", *(("346k", "--to", "330k") if plain else ours))
    assert ran.code == 0
    lines = ran.out.splitlines()
    assert all(len(line) <= 80 for line in lines if not line.startswith("  Next:"))
    assert lines[-1].startswith("  Next:  benchtool ")
    words = " ".join(ran.out.split())
    assert ("Put 7.15 MΩ (E96) across it." if plain else "replace it by 330 kΩ (E24)") in words
    assert "find the cause before you trim" in words
    assert ("explain trim" if plain else "benchtool diagnose FILE") in lines[-1]


def test_every_code_leads_to_the_manual(capsys: Capsys, design: Path) -> None:
    rows = pick(capsys, "--design", design, *OURS, "--have", "RB=346k")
    assert codes(rows)
    assert all(lookup(code) is not None for code in codes(rows))
