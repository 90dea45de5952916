from __future__ import annotations

import csv
import math
import tomllib
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from benchtool.errors import MeasurementError
from benchtool.fitting import fit_curve

REFERENCE = Path(__file__).parents[1] / "reference"
CERTIFIED = tomllib.loads((REFERENCE / "nist_nonlinear.toml").read_text(encoding="utf-8"))


def observations(name: str) -> tuple[np.ndarray, np.ndarray]:
    with (REFERENCE / "nist_nonlinear.csv").open(encoding="utf-8") as lines:
        rows = csv.DictReader(line for line in lines if not line.startswith("#"))
        pairs = [(float(row["x"]), float(row["y"])) for row in rows if row["set"] == name]
    x, y = np.array(pairs).T
    return x, y


def saturating(x: np.ndarray) -> Callable[[np.ndarray], np.ndarray]:
    return lambda b: b[0] * (1 - np.exp(-b[1] * x))


def two_exponentials(x: np.ndarray) -> Callable[[np.ndarray], np.ndarray]:
    return lambda b: b[0] + b[1] * np.exp(-x * b[3]) + b[2] * np.exp(-x * b[4])


CURVES = {"Misra1a": saturating, "BoxBOD": saturating, "MGH17": two_exponentials}


def digits(found: np.ndarray, certified: list[float]) -> float:
    """Return the significant digits in which all figures agree."""
    away = np.max(np.abs(found / np.array(certified) - 1))
    return 17.0 if away == 0 else -math.log10(away)


@pytest.mark.parametrize("start", ["start1", "start2"])
@pytest.mark.parametrize("name", CERTIFIED)
def test_certified_parameters_are_found_from_both_starts(name: str, start: str) -> None:
    x, y = observations(name)
    assert y.size == CERTIFIED[name]["n"]
    fit = fit_curve(CURVES[name](x), y, np.array(CERTIFIED[name][start]))
    assert digits(fit.values, CERTIFIED[name]["certified"]) >= 6
    assert digits(fit.deviations, CERTIFIED[name]["certified_sd"]) >= 4
    assert digits(np.array([fit.residual_sd]), [CERTIFIED[name]["residual_sd"]]) >= 6
    assert fit.dof == CERTIFIED[name]["dof"]


def test_stated_derivatives_give_the_same_as_differences() -> None:
    x, y = observations("Misra1a")

    def slopes(b: np.ndarray) -> np.ndarray:
        decay = np.exp(-b[1] * x)
        return np.column_stack([1 - decay, b[0] * x * decay])

    start = np.array(CERTIFIED["Misra1a"]["start2"])
    stated = fit_curve(saturating(x), y, start, slopes=slopes)
    assert digits(stated.values, CERTIFIED["Misra1a"]["certified"]) >= 8
    assert digits(stated.deviations, CERTIFIED["Misra1a"]["certified_sd"]) >= 8


def test_a_weight_counts_as_so_many_observations() -> None:
    x, y = np.array([0.0, 1.0, 2.0, 3.0]), np.array([1.0, 2.9, 5.2, 6.9])
    u = np.array([1.0, 1.0, 0.5, 1.0])  # half the u: as good as four
    weighted = fit_curve(lambda b: b[0] + b[1] * x, y, np.array([0.0, 1.0]), u=u)
    often = np.repeat(np.arange(4), [1, 1, 4, 1])
    repeated = fit_curve(lambda b: b[0] + b[1] * x[often], y[often], np.array([0.0, 1.0]))
    assert weighted.values == pytest.approx(repeated.values, rel=1e-12)
    assert weighted.unscaled == pytest.approx(repeated.unscaled, rel=1e-10)


def test_a_curve_through_all_points_is_found_exactly() -> None:
    x = np.linspace(0, 1, 20)
    fit = fit_curve(lambda b: b[0] * np.exp(-x / b[1]), 3 * np.exp(-x / 0.4), np.array([1.0, 1.0]))
    assert fit.values == pytest.approx([3, 0.4], rel=1e-10)


@pytest.mark.parametrize(
    ("curve", "start", "words"),
    [
        (lambda b: b[0] + b[1] + b[2] + 0 * np.arange(2.0), [1.0, 1.0, 1.0], "cannot fix"),
        (lambda b: b[0] * np.exp(1e4 * np.arange(9.0)), [1.0], "not finite"),
        (lambda b: b[0] + 0 * b[1] + np.zeros(9), [1.0, 1.0], "none of the observations"),
        (lambda b: b[0] + b[1] + np.zeros(9), [1.0, 2.0], "act alike"),
    ],
)
def test_what_cannot_be_fitted_is_refused(
    curve: Callable[[np.ndarray], np.ndarray], start: list[float], words: str
) -> None:
    n = 2 if words == "cannot fix" else 9
    with pytest.raises(MeasurementError, match=words) as caught:
        fit_curve(curve, np.arange(float(n)), np.array(start))
    assert caught.value.code == "fit-failed"
