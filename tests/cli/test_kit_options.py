"""An instrument of the user's kit, named on the command line."""

from __future__ import annotations

from pathlib import Path

import pytest
from running import run_apart

KIT = """
[instrument.left]
timebase = "2.5 ppm"
calibration_due = {due}
probe = "ten-to-one"
[probe.ten-to-one]
R = "10M"
C = "12p"
"""


@pytest.fixture
def kit(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path))
    path = tmp_path / "benchtool" / "kit.toml"
    path.parent.mkdir()
    path.write_text(KIT.format(due="2999-01-01"))
    return path


@pytest.mark.usefixtures("kit")
def test_the_kit_gives_timebase_and_probe_and_the_document_names_it(good: Path) -> None:
    ran = run_apart("measure", str(good), "--instrument", "left", "--json", "--budget")
    document = ran.document
    assert document["instrument"]["name"] == "left"
    assert document["instrument"]["probe"] == "ten-to-one"
    budget = document["results"][0]["budgets"]["period"]
    period_s = document["results"][0]["timing"]["period"]["value"]
    timebase = next(part for part in budget if part["source"] == "timebase")
    # a half-width of a rectangular distribution: JCGM 100:2008, 4.3.7
    assert timebase["u"] == pytest.approx(2.5e-6 / 3**0.5 * period_s, rel=1e-6)


@pytest.mark.usefixtures("kit")
def test_an_option_wins_over_the_kit(good: Path) -> None:
    given = ("--instrument", "left", "--timebase", "0", "--json", "--budget")
    document = run_apart("measure", str(good), *given).document
    budget = document["results"][0]["budgets"]["period"]
    assert all(part["u"] == 0 for part in budget if part["source"] == "timebase")


def test_a_calibration_past_its_day_is_said(good: Path, kit: Path) -> None:
    kit.write_text(KIT.format(due="2001-01-01"))
    document = run_apart("measure", str(good), "--instrument", "left", "--json").document
    assert "calibration-overdue" in {warning["code"] for warning in document["warnings"]}


@pytest.mark.usefixtures("kit")
def test_the_report_names_instrument_and_calibration(good: Path, tmp_path: Path) -> None:
    report = tmp_path / "out.md"
    run_apart("measure", str(good), "--instrument", "left", "--report", str(report))
    assert "left, probe ten-to-one, calibration due 2999-01-01" in report.read_text()


def test_a_name_without_a_kit_says_where_to_write_one(
    good: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path / "none"))
    ran = run_apart("measure", str(good), "--instrument", "left")
    assert ran.code == 2
    assert "no kit is kept yet" in ran.err
    assert "kit.toml" in ran.err
