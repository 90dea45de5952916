"""An early answer from a part of one slope of the node."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest
from running import run_here

Capsys = pytest.CaptureFixture[str]
DESIGN = Path(__file__).parents[2] / "sample_captures" / "mist_valve.toml"
TAU_S = 430e3 * 47e-6
END_V, BEGIN_V = 12.0, 4.5


def write_slope(path: Path, length_s: float, *, end_v: float = END_V) -> Path:
    """Write a slope as the closed form has it, with 5 mV of noise."""
    times_s = np.arange(0.0, length_s, 0.02)
    noise_v = np.random.default_rng(3).normal(0, 5e-3, times_s.size)
    volts = end_v + (BEGIN_V - end_v) * np.exp(-times_s / TAU_S) + noise_v
    rows = [f"{t:.2f},{v:.4f}" for t, v in zip(times_s, volts, strict=True)]
    path.write_text("\n".join(["Time (s),NODE (V)", *rows]) + "\n")
    return path


def test_a_third_of_a_slope_gives_the_time_constant_and_the_whole_length(
    tmp_path: Path, capsys: Capsys
) -> None:
    slope = write_slope(tmp_path / "slope.csv", 7.0)
    given = ("solve", slope, "--asymptote", "12V ± 20mV", "--design", DESIGN, "--json")
    early = run_here(capsys, *given).document["results"][0]["early"]
    assert early["rises"] is True
    assert abs(early["tau"]["value"] - TAU_S) < 1.5 * early["tau"]["U"]
    assert early["tau"]["U"] < 0.05 * TAU_S
    # from a third to two thirds of the supply: tau times ln 2
    assert abs(early["length"]["value"] - TAU_S * math.log(2)) < 1.5 * early["length"]["U"]


def test_a_slope_that_is_too_short_is_refused(tmp_path: Path, capsys: Capsys) -> None:
    slope = write_slope(tmp_path / "slope.csv", 0.7)
    ran = run_here(capsys, "solve", slope, "--asymptote", "12V ± 4V")
    assert ran.code == 4
    assert "slope-too-short" in ran.err


def test_a_slope_that_goes_the_other_way_is_refused(tmp_path: Path, capsys: Capsys) -> None:
    slope = write_slope(tmp_path / "slope.csv", 7.0, end_v=0.0)
    ran = run_here(capsys, "solve", slope, "--asymptote", "12V")
    assert ran.code == 4
    assert "falls" in ran.err


def test_it_needs_a_file(capsys: Capsys) -> None:
    ran = run_here(capsys, "solve", "--asymptote", "12V", "--topology", "astable")
    assert ran.code == 2
    assert "needs a capture" in ran.err


def test_the_screen_says_how_much_was_seen(tmp_path: Path, capsys: Capsys) -> None:
    slope = write_slope(tmp_path / "slope.csv", 7.0)
    ran = run_here(capsys, "solve", slope, "--asymptote", "12V ± 20mV")
    assert "0.34" in ran.out  # 7 s of 20.2 s, less half a bin at either end
    assert "350 samples at 20 ms, 7 s" in ran.out
