"""A counter on the command line: readings into a file, and every verb that takes it."""

from __future__ import annotations

import json
from pathlib import Path

import jsonschema
import numpy as np
import pytest
from running import Ran, run_here

import benchtool
from benchtool.cli import cautions
from benchtool_drivers.loopback.families.counters import (
    Beat,
    FunctionCounter,
    SimulatedCounter,
    StampCounter,
)
from benchtool_drivers.loopback.serving import serve

ROOT = Path(__file__).parents[2]
DESIGN = ROOT / "sample_captures" / "mist_valve.toml"
PACKAGE = Path(benchtool.__file__).parent
SCHEMA = json.loads((PACKAGE / "report" / "document.schema.json").read_text("utf-8"))


def board() -> Beat:
    """Return the invented greenhouse misting controller: about 14 s high, 10.75 s low."""
    return Beat(t_high=14.01, t_low=10.75, jitter_rel=1e-4)


@pytest.fixture(autouse=True)
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Give each test a folder and a config of its own, and cautions not yet told."""
    monkeypatch.setattr(cautions, "_TOLD", [])
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path / "config"))
    monkeypatch.chdir(tmp_path)


def acquired(capsys: pytest.CaptureFixture[str], subject: SimulatedCounter, *arguments: str) -> Ran:
    with serve(subject, "socket") as resource:
        return run_here(capsys, "acquire", resource, *arguments)


def test_readings_are_taken_written_and_judged(capsys: pytest.CaptureFixture[str]) -> None:
    subject = FunctionCounter(board)
    ran = acquired(capsys, subject, "--readings", "12", "-o", "readings.npz")
    assert (ran.code, ran.out) == (0, "")
    assert "12 t_high, 12 t_low, 12 period, 12 frequency, 12 duty" in ran.err
    assert ran.err.count("armed") == 1
    with np.load("readings.npz") as archive:
        np.testing.assert_array_equal(archive["t_high"], subject.sent[0])
        np.testing.assert_array_equal(archive["duty"], subject.sent[4] * 1e-2)
    sidecar = json.loads(Path("readings.npz.json").read_text("utf-8"))
    assert sidecar["traces"] == []
    assert sidecar["counted"]["readings"]["period"]["n"] == 12
    assert sidecar["identity"] == subject.identity
    assert sidecar["dialect"] == "counter-scpi99"

    measured = run_here(capsys, "measure", "readings.npz", "--json")
    assert measured.code == 0
    jsonschema.validate(measured.document, SCHEMA)
    result = measured.document["results"][0]
    assert "trace" not in result
    assert result["counted"]["readings"]["t_low"]["per"] == "interval"
    assert result["timing"]["t_high"]["value"] == pytest.approx(subject.sent[0].mean(), rel=1e-12)
    for verb in ("solve", "judge"):
        ran = run_here(capsys, verb, "readings.npz", "--design", DESIGN, "--json")
        assert ran.code == 0
        jsonschema.validate(ran.document, SCHEMA)
        assert ran.document["results"][0]["timing"] == result["timing"]
    assert ran.document["verdict"] == "pass"


def test_screens_and_pages_say_counter_readings(capsys: pytest.CaptureFixture[str]) -> None:
    acquired(capsys, FunctionCounter(board), "--readings", "9", "-o", "readings.npz")
    for arguments in (
        ("measure", "readings.npz"),
        ("solve", "readings.npz", "--design", str(DESIGN)),
        ("judge", "readings.npz", "--design", str(DESIGN), "--report", "board.html"),
    ):
        ran = run_here(capsys, *arguments)
        assert ran.code == 0
        assert "counter readings of input 1" in ran.out
        assert "figures as given" not in ran.out
    assert "counter readings of input 1" in Path("board.html").read_text("utf-8")


def test_look_names_what_it_is_and_what_to_do(capsys: pytest.CaptureFixture[str]) -> None:
    acquired(capsys, FunctionCounter(board), "--readings", "3", "-o", "readings.npz")
    ran = run_here(capsys, "look", "readings.npz")
    assert ran.code != 0
    assert "readings.npz holds a counter's readings" in ran.err
    assert "benchtool measure readings.npz" in ran.err
    assert run_here(capsys, "measure", "readings.npz", "--intervals", "x.csv").code == 2
    assert not Path("x.csv").exists()


def test_one_function_and_several_runs(capsys: pytest.CaptureFixture[str]) -> None:
    ran = acquired(
        capsys,
        FunctionCounter(board),
        *("--readings", "4", "--function", "period", "--captures", "2", "-o", "run.npz", "--json"),
    )
    assert ran.code == 0
    assert [Path(f"run-00{k}.npz").exists() for k in (1, 2, 3)] == [True, True, False]
    with np.load("run-002.npz") as archive:
        assert archive["period"].size == 4
        assert "t_high" not in archive.files


def test_time_stamps_become_a_capture(capsys: pytest.CaptureFixture[str]) -> None:
    ran = acquired(capsys, StampCounter(board), "--readings", "41", "-o", "edges.npz")
    assert ran.code == 0
    assert "20 complete periods" in ran.err
    measured = run_here(capsys, "measure", "edges.npz", "--json")
    period = measured.document["results"][0]["timing"]["period"]
    # the mean of 20 cycles with 1e-4 of jitter each, five standard deviations
    assert period["value"] == pytest.approx(24.76, rel=5e-4 / 20**0.5)


@pytest.mark.parametrize(
    ("counter", "arguments", "code", "said"),
    [
        (FunctionCounter, ("--until", "50 periods"), 2, "--readings 100"),
        (FunctionCounter, ("--function", "width"), 2, "t_high, t_low, period"),
        (StampCounter, ("--function", "period"), 2, "--function"),
        (FunctionCounter, ("--channel", "3"), 2, "1, 2"),
    ],
)
def test_what_cannot_be_is_refused_and_nothing_is_written(
    capsys: pytest.CaptureFixture[str],
    counter: type[SimulatedCounter],
    arguments: tuple[str, ...],
    code: int,
    said: str,
) -> None:
    ran = acquired(capsys, counter(board), *arguments, "-o", "readings.npz")
    assert ran.code == code
    assert said in ran.err
    assert not list(Path().glob("*.npz*"))


def test_a_counter_that_sees_nothing_is_named_and_nothing_is_written(
    capsys: pytest.CaptureFixture[str],
) -> None:
    ran = acquired(capsys, FunctionCounter(board, fault="all_nan"), "-o", "readings.npz")
    assert ran.code == 5
    assert "all 100 readings of t_high are marked as none" in ran.err
    assert not list(Path().glob("*.npz*"))


@pytest.mark.parametrize(
    ("counter", "dialect", "said"),
    [
        (FunctionCounter, "counter-scpi99", "period: 5 readings"),
        (StampCounter, "counter-timestamps", "1: 5 logic samples"),
    ],
)
def test_a_counters_dialect_can_be_tried(
    capsys: pytest.CaptureFixture[str], counter: type[SimulatedCounter], dialect: str, said: str
) -> None:
    with serve(counter(board), "socket") as resource:
        ran = run_here(capsys, "instruments", "try", dialect, resource, "--readings", "5")
        assert ran.code == 0
        assert said in ran.out
        tried = run_here(
            capsys, "instruments", "try", dialect, resource, "--readings", "5", "--json"
        )
    assert tried.code == 0
    assert tried.document
