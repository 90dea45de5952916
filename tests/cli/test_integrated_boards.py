"""Diagnoses held against boards that scipy's integrator made, their truth known exactly.

Each figure of a reading is the board's own. A healthy board of the design has parts within their
tolerances; that of these boards is a little off in each.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
from integrated_boards import Board, write_board
from running import run_here

DESIGN = Path(__file__).parents[2] / "sample_captures" / "mist_valve.toml"
GOOD = Board(ra=100.3e3, rb=329e3, c=47.8e-6, supply=12.03, upper=0.6683, lower=0.3337)

Capsys = pytest.CaptureFixture[str]


def diagnose(capsys: Capsys, *given: object) -> dict:
    ran = run_here(capsys, "diagnose", *map(str, given), "--design", str(DESIGN), "--json")
    assert ran.code == 0, ran.err
    return ran.document["results"][0]


@pytest.mark.parametrize(
    ("fault", "board", "readings"),
    [
        ("healthy", GOOD, ()),
        ("C-low", replace(GOOD, c=0.7 * GOOD.c), ()),
        ("C-low", replace(GOOD, c=0.3 * GOOD.c), ()),
        ("RB-low", replace(GOOD, rb=228e3), ()),
        ("RA-low", replace(GOOD, ra=47e3), ("RA<=47.1k",)),
        ("control-low", replace(GOOD, upper=0.57, lower=0.285), ("control-pin=6.857V",)),
        ("discharge-weak", replace(GOOD, switch_ohm=30e3), ()),
        ("wrong-ic-family", replace(GOOD, drop=1.5), ("output-high=10.53V",)),
    ],
)
def test_the_fault_of_an_integrated_board_is_the_first_suspect(
    fault: str, board: Board, readings: tuple[str, ...], tmp_path: Path, capsys: Capsys
) -> None:
    capture = write_board(tmp_path / "board.csv", board)
    given = [word for text in readings for word in ("--reading", text)]
    result = diagnose(capsys, capture, *given)
    assert result["suspects"][0]["fault"] == fault
    assert result["single_fault"]["p_value"] > 0.05
    assert "No single fault" not in result["sentence"]


def test_a_leaking_capacitor_and_a_probe_are_told_apart_without_the_probe(
    tmp_path: Path, capsys: Capsys
) -> None:
    leaky, probed = replace(GOOD, leak=1.5e6), replace(GOOD, probe=10e6)
    main = write_board(tmp_path / "leaky.csv", leaky)
    found = diagnose(capsys, main)
    assert {"C-leaky", "probe-load"} <= set(found["groups"][0]["members"])
    assert found["suspects"][0]["fault"] == "C-leaky"
    assert found["suspects"][0]["probability"] > 0.8  # few probes have 1.5 MΩ
    assert found["next"][0]["reading"] == "probe-lifted"
    lifted = write_board(tmp_path / "lifted.csv", leaky)
    assert diagnose(capsys, main, "--probe-lifted", lifted)["suspects"][0]["fault"] == "C-leaky"
    main = write_board(tmp_path / "probed.csv", probed)
    lifted = write_board(tmp_path / "free.csv", GOOD)
    found = diagnose(capsys, main, "--probe-lifted", lifted)
    assert found["suspects"][0]["fault"] == "probe-load"


def test_a_stated_probe_beside_the_output_is_no_leak(tmp_path: Path, capsys: Capsys) -> None:
    probed = replace(GOOD, probe=10e6)
    both = write_board(tmp_path / "both.csv", probed, node=True)
    found = diagnose(capsys, both, "--probe", "10M 0p")
    assert found["suspects"][0]["fault"] == "healthy"
    unstated = diagnose(capsys, both)
    assert unstated["suspects"][0]["fault"] == "probe-load"
    assert "assumed-no-probe-load" in {item["code"] for item in unstated["warnings"]}


def test_a_node_recorded_apart_clears_the_board_and_blames_the_probe(
    tmp_path: Path, capsys: Capsys
) -> None:
    probed = replace(GOOD, probe=10e6)
    node = write_board(tmp_path / "node.csv", probed, node=True)
    free = write_board(tmp_path / "free.csv", GOOD)
    loaded = write_board(tmp_path / "loaded.csv", probed)
    found = diagnose(capsys, free, "--node", node, "--probe", "10M 0p")
    assert found["suspects"][0]["fault"] == "healthy"
    found = diagnose(capsys, loaded, "--node", node, "--probe", "10M 0p")
    assert found["suspects"][0]["fault"] == "probe-load"
    unstated = diagnose(capsys, free, "--node", node)
    assert unstated["suspects"][0]["fault"] == "healthy"
    assert "assumed-probe-load" in {item["code"] for item in unstated["warnings"]}


def test_two_faults_at_once_are_not_taken_for_one(tmp_path: Path, capsys: Capsys) -> None:
    board = replace(GOOD, c=0.7 * GOOD.c, leak=2e6)
    found = diagnose(capsys, write_board(tmp_path / "two.csv", board))
    assert found["single_fault"]["p_value"] < 0.05
    assert not found["certain"]
    assert "second one" in found["sentence"] or "No single fault" in found["sentence"]


def test_a_series_resistance_shows_at_the_node(tmp_path: Path, capsys: Capsys) -> None:
    board = replace(GOOD, esr=20e3)
    main = write_board(tmp_path / "esr.csv", board)
    node = write_board(tmp_path / "node.csv", replace(board, probe=10e6), node=True)
    found = diagnose(capsys, main, "--node", node, "--probe", "10M 0p")
    assert found["suspects"][0]["fault"] == "C-esr"


def test_a_power_up_tells_a_lower_threshold_from_a_low_rb(tmp_path: Path, capsys: Capsys) -> None:
    board = replace(GOOD, lower=1.15 * GOOD.lower)
    main = write_board(tmp_path / "main.csv", board)
    first = write_board(tmp_path / "first.csv", board, power_up=True)
    found = diagnose(capsys, main, "--power-up", first)
    assert found["suspects"][0]["fault"] == "lower-threshold"
    assert "the first high after power-up" in found["used"]
