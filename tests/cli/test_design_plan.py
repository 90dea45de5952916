"""``design plan`` as a user runs it, and against what ``measure`` and ``judge`` then say."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import pytest
from running import run_here

from benchtool.manual import lookup

Capsys = pytest.CaptureFixture[str]


def plan(capsys: Capsys, *arguments: str | Path) -> dict[str, Any]:
    ran = run_here(capsys, "design", "plan", *arguments, "--json")
    assert ran.code == 0, ran.out
    rows: list[dict[str, Any]] = ran.document["rows"]
    assert len(rows) == 1
    return rows[0]


def of(row: dict[str, Any], name: str) -> dict[str, Any]:
    return next(item for item in row["quantities"] if item["quantity"] == name)


def codes(row: dict[str, Any]) -> set[str]:
    return {item["code"] for item in row["warnings"]}


def test_a_plan_carried_out_measures_with_the_u_it_promised(
    capsys: Capsys, design: Path, tmp_path: Path
) -> None:
    """Plan, simulate by the plan, judge: one interval, so that nothing is left to chance.

    1e-2: the nominal board of the plan is the board of the capture.
    """
    row = plan(capsys, design)
    path = tmp_path / "trial.csv"
    rate, span = f"{row['rate_hz']}Hz", f"{row['span_s'] - 12}s"  # one period, never two
    made = run_here(
        capsys, "simulate", design, "--rate", rate, "--duration", span, "-o", path, "--quiet"
    )
    assert made.code == 0
    judged = run_here(capsys, "judge", path, "--design", design, "--json")
    result = judged.document["results"][0]
    assert result["timing"]["period"]["n"] == row["intervals"] == 1
    assert result["timing"]["period"]["U"] == pytest.approx(of(row, "period")["U"], rel=1e-2)
    checks = {item["quantity"]: item for item in result["checks"]}
    band = checks["period"]["accept_lower"] - checks["period"]["lower"]
    assert band == pytest.approx(of(row, "period")["guard_band"], rel=1e-2)


def test_the_row_holds_record_figures_risks_and_probe(capsys: Capsys, design: Path) -> None:
    row = plan(capsys, design, "--stage", "spacing", "--time-per-board", "60s")
    assert row["channel"] == "OUT"
    assert row["unit"] == "period"
    assert row["intervals_in_time"] == 1
    assert row["needed"]["four_to_one"] is True
    period = of(row, "period")
    assert (period["lower"], period["upper"]) == (22.0, 28.0)
    assert period["room"] == pytest.approx(3.0 / period["U"])
    shares = [period["risks"][name] for name in ("passing", "undecided", "failing")]
    assert math.fsum(shares) == pytest.approx(1.0)
    assert math.hypot(*(term["u"] for term in period["budget"])) == pytest.approx(period["u"])
    probe = row["probe_at_capacitor"]
    assert probe["r_ohm"] == 10e6
    assert probe["shifts"]["t_high"] > 0.04


def test_rate_span_and_instrument_as_given_are_taken(capsys: Capsys, design: Path) -> None:
    row = plan(
        capsys,
        design,
        "--rate",
        "1kHz",
        "--span",
        "5min",
        "--timebase",
        "1000ppm",
        "--bits",
        "8",
        "--noise",
        "50mV",
        "--bandwidth",
        "50Hz",
        "--jitter",
        "0.01%",
        "--probe",
        "1M 15p",
    )
    assert (row["rate_hz"], row["rate_given"]) == (1000.0, True)
    assert (row["span_s"], row["span_given"]) == (300.0, True)
    assert row["intervals"] == 9  # (300 s - 28 s) / 28 s
    sources = {term["source"] for term in of(row, "t_high")["budget"]}
    assert "timebase" in sources
    assert "assumed-jitter" not in codes(row)
    assert row["probe_at_capacitor"]["r_ohm"] == 1e6


def test_a_probe_without_a_stated_resistance_loads_by_its_capacitance_alone(
    capsys: Capsys, design: Path
) -> None:
    design.write_text(design.read_text("utf-8") + '\n[probe]\nC = "1u"\n', "utf-8")
    probe = plan(capsys, design)["probe_at_capacitor"]
    assert (probe["r_ohm"], probe["c_f"]) == (None, 1e-6)
    assert probe["shifts"]["t_high"] == pytest.approx(1 / 47, rel=0.01)


def test_a_time_per_board_that_is_too_short_is_said(capsys: Capsys, design: Path) -> None:
    row = plan(capsys, design, "--time-per-board", "20s")
    assert row["intervals_in_time"] == 0
    assert {"time-too-short", "no-interval-sure"} <= codes(row)
    assert of(row, "period")["U"] is None
    assert row["board"]["undecided"] == 1.0


def test_an_instrument_of_the_kit_brings_its_timebase_and_probe(
    capsys: Capsys, design: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path))
    folder = tmp_path / "benchtool"
    folder.mkdir()
    (folder / "kit.toml").write_text(
        '[probe.long]\nR = "1M"\nC = "50p"\n\n'
        '[instrument.bench]\ntimebase = "2000 ppm"\nprobe = "long"\n',
        "utf-8",
    )
    row = plan(capsys, design, "--instrument", "bench")
    assert row["instrument"] == "bench"
    assert row["probe_at_capacitor"]["r_ohm"] == 1e6
    timebase = next(t for t in of(row, "period")["budget"] if t["source"] == "timebase")
    assert timebase["u"] == pytest.approx(2e-3 / math.sqrt(3) * of(row, "period")["nominal"])


@pytest.mark.parametrize(
    "arguments",
    [
        ("--rate", "0"),
        ("--span", "-3s"),
        ("--noise=-1V",),
        ("--jitter", "80%"),
        ("--bits", "1"),
        ("--stage", "drain"),
        ("--instrument", "nobody"),
    ],
)
def test_what_cannot_be_planned_is_refused(
    capsys: Capsys, design: Path, arguments: tuple[str, ...]
) -> None:
    ran = run_here(capsys, "design", "plan", design, *arguments, "--json")
    assert ran.code == 2
    assert ran.document["error"]["hint"]


def test_a_design_that_stands_still_exits_as_a_design_error(capsys: Capsys, design: Path) -> None:
    text = design.read_text("utf-8").replace('ic = "cmos"', 'ic = "cmos"\nleak = "100k"')
    design.write_text(text, "utf-8")
    ran = run_here(capsys, "design", "plan", design, "--json")
    assert ran.code == 6
    assert "design check" in ran.document["error"]["hint"]


@pytest.mark.parametrize("time", ["60s", "20s"])
def test_the_screen_answers_in_words_within_80_columns(
    capsys: Capsys, design: Path, monkeypatch: pytest.MonkeyPatch, time: str
) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    ran = run_here(capsys, "design", "plan", design, "--time-per-board", time)
    assert ran.code == 0
    lines = ran.out.splitlines()
    assert all(len(line) <= 80 for line in lines if not line.startswith("  Next:"))
    assert lines[-1].startswith("  Next:  benchtool simulate ")
    words = " ".join(ran.out.split())
    assert ("are enough" if time == "60s" else "too short") in words
    advice = "Record OUT for 56 s" if time == "60s" else "So short a record may hold nothing whole"
    assert advice in words
    assert "probe the output" in words
    assert "JCGM 106:2012" in words


def test_every_code_leads_to_the_manual(capsys: Capsys, design: Path) -> None:
    found = codes(plan(capsys, design, "--time-per-board", "20s", "--rate", "0.1Hz"))
    assert {"rate-too-low", "time-too-short"} <= found
    assert all(lookup(code) is not None for code in found)
