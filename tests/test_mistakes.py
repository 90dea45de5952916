"""What cannot be meant is refused in one line, and what says nothing is said to."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from benchtool.errors import BenchtoolError
from benchtool.evidence import Companion
from benchtool.model.diagnosis import Reading
from benchtool.pipeline import diagnose

SAMPLES = Path(__file__).parents[1] / "sample_captures"
DESIGN = SAMPLES / "mist_valve.toml"
GOOD, LEAKY, STUCK = (SAMPLES / f"{n}.csv" for n in ("good_board", "leaky_c", "stuck_high"))


def refusal(*given: object, **how: object) -> BenchtoolError:
    with pytest.raises(BenchtoolError) as caught:
        diagnose(*given, **how)  # type: ignore[arg-type]
    assert caught.value.hint
    return caught.value


def codes_of(source: Path, **how: object) -> set[str]:
    found = diagnose(source, DESIGN, **how)  # type: ignore[arg-type]
    return {notice.code for notice in found.results[0].warnings}


@pytest.mark.parametrize("role", ["shunt", "baseline", "probe-lifted"])
def test_the_same_capture_twice_is_refused(role: str) -> None:
    value = 2.2e6 if role == "shunt" else None
    again = Companion(role=role, source=str(GOOD), value=value, u=1e4)  # type: ignore[arg-type]
    assert refusal(GOOD, DESIGN, companions=(again,)).code == "same-capture"


def test_a_shunt_that_would_stop_the_board_is_refused_where_the_board_ran() -> None:
    small = Companion(role="shunt", source=str(LEAKY), value=330e3, u=1e3)
    assert refusal(GOOD, DESIGN, companions=(small,)).code == "shunt-too-small"


def test_a_reading_that_may_be_of_two_stages_is_refused(tmp_path: Path) -> None:
    text = DESIGN.read_text(encoding="utf-8")
    stage = text[text.index("[stage.spacing]") : text.index("[decision]")]
    second = stage.replace("stage.spacing", "stage.pause").replace('"OUT"', '"OUT2"')
    (tmp_path / "two.toml").write_text(text + second, encoding="utf-8")
    times_s, out_v = np.loadtxt(GOOD, delimiter=",", skiprows=1, usecols=(0, 1), unpack=True)
    rows = "\n".join(f"{t:.4f},{v:.3f},{v:.3f}" for t, v in zip(times_s, out_v, strict=True))
    (tmp_path / "two.csv").write_text(f"Time (s),OUT,OUT2\n{rows}\n", encoding="utf-8")
    rb = Reading(kind="part", part="RB", value=330e3, u=1e3, unit="ohm")
    given = (tmp_path / "two.csv", tmp_path / "two.toml")
    assert refusal(*given, readings=(rb,)).code == "stage-not-named"
    assert len(diagnose(*given).results) == 2
    assert len(diagnose(*given, stage="pause", readings=(rb,)).results) == 1


def test_a_record_shorter_than_a_healthy_state_calls_no_board_dead(tmp_path: Path) -> None:
    noise_v = np.random.default_rng(5).normal(0.03, 0.02, 400)
    rows = "\n".join(f"{0.01 * k:.2f},{v:.3f}" for k, v in enumerate(noise_v))
    (tmp_path / "short.csv").write_text(f"Time (s),OUT (V)\n{rows}\n", encoding="utf-8")
    error = refusal(tmp_path / "short.csv", DESIGN)
    assert error.code == "no-interval"
    assert "Record 42 s" in error.hint  # four times RB·C·ln 2, less 1.5 % for 0.25 µA leaking


def test_what_a_dead_board_cannot_use_is_said() -> None:
    rb = Reading(kind="part", part="RB", value=330e3, u=1e3, unit="ohm")
    assert {"capture-left-out", "reading-left-out"} <= codes_of(
        STUCK, companions=(Companion(role="baseline", source=str(GOOD)),), readings=(rb,)
    )


def test_a_further_capture_without_an_edge_is_said_to_say_nothing() -> None:
    dead = Companion(role="shunt", source=str(STUCK), value=2.2e6, u=1e4)
    assert "capture-left-out" in codes_of(GOOD, companions=(dead,))


def test_a_power_up_capture_that_begins_late_is_said_to_show_no_first_high() -> None:
    late = Companion(role="power-up", source=str(LEAKY))
    assert "no-first-high" in codes_of(GOOD, companions=(late,))
