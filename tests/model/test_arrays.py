"""The functions that stand in for numpy's own, against numpy's own."""

from __future__ import annotations

import subprocess
import sys

import numpy as np
import pytest

from benchtool.model.arrays import distinct, middle, quantile

RNG = np.random.default_rng(5)
ROWS = [RNG.normal(size=n).round(1) for n in (1, 2, 3, 10, 1001)]


@pytest.mark.parametrize("values", ROWS, ids=len)
@pytest.mark.parametrize("share", [0.0, 0.05, 0.3, 0.9, 1.0])
def test_quantile_is_numpys(values: np.ndarray, share: float) -> None:
    assert quantile(values, share) == pytest.approx(np.quantile(values, share), abs=1e-15)


@pytest.mark.parametrize("values", ROWS, ids=len)
def test_median_and_distinct_values_are_numpys(values: np.ndarray) -> None:
    assert middle(values) == pytest.approx(np.median(values), abs=1e-15)
    assert distinct(values).tolist() == np.unique(values).tolist()


def test_they_load_no_masked_arrays() -> None:
    code = (
        "import sys, numpy; from benchtool.model.arrays import *; x = numpy.arange(5.0);"
        "quantile(x, 0.3), middle(x), distinct(x); print('numpy.ma' in sys.modules)"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert run.stdout.strip() == "False"
