from __future__ import annotations

import csv
import math
import tomllib
from decimal import Decimal
from pathlib import Path

import numpy as np
import pytest

from benchtool.timing.scatter import lag_one, two_pass_sd

REFERENCE = Path(__file__).parents[1] / "reference"
CERTIFIED = tomllib.loads((REFERENCE / "nist_univariate.toml").read_text(encoding="utf-8"))


def observations(name: str) -> np.ndarray:
    if name == "NumAcc1":
        return np.array([10000001.0, 10000003.0, 10000002.0])
    if name.startswith("NumAcc"):
        # 1001 values: x.2, then x.1 and x.3 in turn (their own description)
        base = {"NumAcc2": "1", "NumAcc3": "1000000", "NumAcc4": "10000000"}[name]
        return np.array([float(f"{base}.2"), *[float(f"{base}.{d}") for d in "13" * 500]])
    with (REFERENCE / "nist_univariate.csv").open(encoding="utf-8") as lines:
        rows = csv.DictReader(line for line in lines if not line.startswith("#"))
        return np.array([float(row["value"]) for row in rows if row["set"] == name])


def agreement(found: float, certified: str) -> float:
    """Return the number of significant digits in which two values agree."""
    exact = Decimal(certified)
    away = abs((Decimal(found) - exact) / exact)
    return 17.0 if away == 0 else -math.log10(away)


@pytest.mark.parametrize("name", CERTIFIED)
def test_standard_deviation_agrees_with_the_certified_one(name: str) -> None:
    values = observations(name)
    assert values.size == CERTIFIED[name]["n"]
    assert agreement(two_pass_sd(values), CERTIFIED[name]["sd"]) >= CERTIFIED[name]["digits"]


@pytest.mark.parametrize("name", CERTIFIED)
def test_mean_and_lag_one_agree_with_the_certified_ones(name: str) -> None:
    values = observations(name)
    lag = lag_one(values)
    assert lag is not None
    assert agreement(float(np.mean(values)), CERTIFIED[name]["mean"]) >= 14
    # the deviations of NumAcc3 and 4 carry only the digits that their sd does
    assert agreement(lag, CERTIFIED[name]["lag1"]) >= CERTIFIED[name]["digits"]
