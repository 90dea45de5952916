"""A part of tests/benchmarks/coverage_of_timing.py: U covers the truth as often as it says."""

from __future__ import annotations

import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parents[1] / "benchmarks"))
from coverage_of_timing import Cell, measure_cell

CAPTURES = 200
# 95 % of 200 has a standard deviation of 1.5 %: below 90 % by chance once in 1000 figures
LEAST = 0.90


@pytest.mark.parametrize(
    "cell",
    [
        Cell(rate=5, noise="none", bits=8, n=1, edge="logic"),
        Cell(rate=20, noise="wander", bits=8, n=3, edge="ticks"),
        Cell(rate=20, noise="edge", bits=8, n=5, edge="logic"),
        Cell(rate=50, noise="wander", bits=8, n=10, edge="trapezoid:3", timebase_rel=50e-6),
        Cell(rate=50, noise="edge", bits=8, n=30, edge="trapezoid:3"),
        Cell(rate=100, noise="both", bits=12, n=30, edge="rc:5"),
        Cell(rate=100, noise="small", bits=8, n=100, edge="trapezoid:20", timebase_rel=50e-6),
        Cell(rate=50, noise="small", bits=8, n=100, edge="ticks"),
    ],
    ids=lambda cell: f"{cell.rate} {cell.noise} {cell.n} {cell.edge}",
)
def test_the_expanded_uncertainty_covers_the_truth(cell: Cell) -> None:
    for name, score in measure_cell(cell, CAPTURES).items():
        assert score.coverage >= LEAST, name
        if cell.n >= 30 and name != "period":
            # U over the half-width that holds 95 % of the errors, which 200 captures fix to 10 %
            assert score.excess < 2.5, name
