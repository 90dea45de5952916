"""One measurement against an earlier one of the same board."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import pytest
from captures import T_HIGH_S, T_LOW_S, write_square

from benchtool.cli.main import main
from benchtool.comparison import compare_timing
from benchtool.model.quantity import Bound, Measured
from benchtool.model.timing import Timing
from benchtool.pipeline import measure


def seconds(value: float, u: float, dof: float = math.inf) -> Measured:
    return Measured(value=value, u=u, unit="s", dof=dof, n=9)


def test_a_change_is_relative_and_its_u_adds_both_captures() -> None:
    now, before = Timing(period=seconds(25.0, 0.03)), Timing(period=seconds(24.0, 0.04))
    (change,) = compare_timing(now, before)
    assert change.quantity == "period"
    assert change.change.value == pytest.approx(1 / 24, rel=1e-12)
    # u(a/b) = √((u_a/b)² + (a·u_b/b²)²), JCGM 100:2008, 5.1.2
    assert change.change.u == pytest.approx(math.hypot(0.03 / 24, 25 * 0.04 / 24**2), rel=1e-12)
    assert change.before.value == 24.0
    assert change.significant


def test_a_change_within_its_U_is_none() -> None:
    now, before = Timing(t_high=seconds(14.05, 0.03)), Timing(t_high=seconds(14.0, 0.03))
    (change,) = compare_timing(now, before)
    assert not change.significant  # 0.05 against 1.96·0.042
    (wider,) = compare_timing(Timing(t_high=seconds(14.09, 0.03)), before)
    assert wider.significant


def test_few_degrees_of_freedom_widen_U() -> None:
    now, before = Timing(t_high=seconds(14.09, 0.03, 2)), Timing(t_high=seconds(14.0, 0.001))
    (change,) = compare_timing(now, before)
    assert not change.significant  # 0.09 against 4.30·0.03


def test_only_what_both_have_is_compared() -> None:
    bound = Bound(unit="s", at_least=3.0)
    now = Timing(t_high=seconds(14, 0.1), t_low=seconds(10, 0.1), period=bound)
    before = Timing(t_high=seconds(14, 0.1), period=seconds(24, 0.1))
    assert [change.quantity for change in compare_timing(now, before)] == ["t_high"]


@pytest.fixture(scope="module")
def captures(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, Path, Path]:
    """A board, the same capture again, and the board with C 0.1 % up; fine steps."""
    tmp_path = tmp_path_factory.mktemp("captures")
    fine: dict[str, Any] = {"dt_s": 0.002, "n_samples": 130_000, "jitter_s": 0.0002}
    was = write_square(tmp_path / "was.csv", **fine)
    same = tmp_path / "same.csv"
    same.write_bytes(was.read_bytes())
    now = write_square(
        tmp_path / "now.csv", t_high_s=1.001 * T_HIGH_S, t_low_s=1.001 * T_LOW_S, seed=2, **fine
    )
    return was, same, now


def test_a_tenth_of_a_percent_is_seen(captures: tuple[Path, Path, Path]) -> None:
    was, same, now = captures
    changes = {item.quantity: item for item in measure(now, baseline=was).results[0].changes}
    period = changes["period"]
    assert period.significant
    assert period.change.value == pytest.approx(1e-3, abs=2 * period.change.u)
    assert not changes["duty"].significant
    none = measure(same, baseline=was).results[0].changes
    assert {item.change.value for item in none} == {0.0}
    assert not any(item.significant for item in none)


def test_the_screen_says_which_changed(
    captures: tuple[Path, Path, Path], capsys: pytest.CaptureFixture[str]
) -> None:
    was, _, now = captures
    assert main(["measure", str(now), "--baseline", str(was)]) == 0
    lines = capsys.readouterr().out.splitlines()
    table = lines[next(i for i, line in enumerate(lines) if "against the baseline" in line) :]
    ends = {line.split()[0]: line.rstrip() for line in table if line.strip()}
    assert ends["period"].endswith("  changed")
    assert ends["duty"].endswith("no change seen")
