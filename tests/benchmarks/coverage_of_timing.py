"""How often U covers the truth, and how much larger it is than it needs to be.

    python tests/benchmarks/coverage_of_timing.py [captures a cell] [processes]

Each cell draws captures with exact truth: a random period over more than one sampling interval,
a random duty and phase, a timebase error from its stated rectangle. One interval cannot show its
jitter, so where N is 1 that is drawn as it is assumed: every interval from a rectangle of 0.1 %.
Cells in step draw their period within a tenth of a step over the record around whole and half
steps. Printed are the share of captures whose interval covers the truth, and the mean U over the
half-width that holds 95 % of the errors.
"""

from __future__ import annotations

import sys
from dataclasses import dataclass
from functools import partial
from multiprocessing import Pool
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parent.parent / "timing"))
import timing_waves as waves

from benchtool.model.capture import Trace
from benchtool.model.options import JITTER_REL
from benchtool.timing import find_edges, find_intervals, measure_timing
from benchtool.uncertainty import expanded

QUANTITIES = ("t_high", "t_low", "period", "duty")
NOISES = {  # accumulating and edge noise, relative to the period
    "none": (0.0, 0.0),
    "wander": (2e-3, 0.0),
    "edge": (0.0, 2e-3),
    "both": (1e-3, 1e-3),
    "small": (1e-5, 0.0),
    "assumed": (0.0, 0.0),
}


SINGLE = {"none": "none", "small": "small"} | dict.fromkeys(("wander", "edge", "both"), "assumed")


@dataclass(frozen=True, slots=True, kw_only=True)
class Cell:
    """One combination; ``edge`` is fast, logic, ticks, or the full rise in samples (RC: tau)."""

    rate: int
    noise: str
    bits: int
    n: int
    edge: str
    timebase_rel: float = 0.0
    in_step: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Score:
    """Coverage, and U over what is needed."""

    coverage: float
    excess: float


def capture(cell: Cell, rng: np.random.Generator) -> tuple[Trace, waves.Board]:
    """Draw one capture."""
    wander, edge_noise = NOISES[cell.noise]
    dt_s = 1e-5
    part = rng.uniform(0, 1)
    if cell.in_step:
        part = rng.integers(0, 2) / 2 + rng.uniform(-0.1, 0.1) / cell.n
    board = waves.Board(
        period_s=(cell.rate + part) * dt_s,
        duty=rng.uniform(0.4, 0.68),
        wander=wander,
        edge_noise=edge_noise,
    )
    edges = waves.edge_times(board, cell.n + 2, rng)
    if cell.noise == "assumed":
        widths_s = np.diff(edges) * (1 + JITTER_REL * rng.uniform(-1, 1, edges.size - 1))
        edges = np.concatenate([[0.0], np.cumsum(widths_s)])
    kind, _, length = cell.edge.partition(":")
    margin_s = (1.5 + float(length or 0) * (2.5 if kind == "rc" else 0.5)) * dt_s
    start_s, end_s = waves.cut_record(edges, cell.n, margin_s, rng)
    stretch = 1 + cell.timebase_rel * rng.uniform(-1, 1)
    if cell.edge == "ticks":
        return waves.transitions(edges, start_s, end_s, dt_s, stretch=stretch), board
    times_s = np.arange(start_s, end_s, dt_s)
    if kind == "rc":
        wave = waves.exponential(times_s, edges, float(length) * dt_s)
    else:
        wave = waves.trapezoid(times_s, edges, float(length or 1e-3) * dt_s)
    if kind == "logic":
        return waves.sampled_logic(wave, dt_s * stretch), board
    noise_v = {8: 0.02, 12: 0.02, 6: 0.0}[cell.bits]
    return waves.digitise(wave, dt_s * stretch, bits=cell.bits, noise_v=noise_v, rng=rng), board


def measure_cell(cell: Cell, captures: int) -> dict[str, Score]:
    """Return the score of each quantity over so many captures."""
    rng = np.random.default_rng([cell.rate, cell.n, *map(ord, cell.noise + cell.edge), cell.bits])
    errors = {name: np.empty(captures) for name in QUANTITIES}
    wide = {name: np.empty(captures) for name in QUANTITIES}
    for i in range(captures):
        trace, board = capture(cell, rng)
        edges = find_edges(trace)
        timing = measure_timing(find_intervals(edges), edges, timebase_rel=cell.timebase_rel)
        for name in QUANTITIES:
            quantity = getattr(timing, name)
            errors[name][i] = abs(quantity.value - board.truth[name])
            wide[name][i] = expanded(quantity)
    return {
        name: Score(
            coverage=float(np.mean(errors[name] <= wide[name])),
            excess=float(np.mean(wide[name]) / max(np.quantile(errors[name], 0.95), 1e-300)),
        )
        for name in QUANTITIES
    }


def cells() -> list[Cell]:
    """Return the grid: all counts for the main cases, fewer for the others."""
    counts = (1, 2, 3, 5, 10, 30, 100, 1000)
    grid = [
        Cell(rate=rate, noise=noise if n > 1 else SINGLE[noise], bits=8, n=n, edge=edge)
        for n in counts
        for rate, noise, edge in (
            (5, "none", "logic"),
            (20, "wander", "ticks"),
            (20, "edge", "logic"),
            (50, "small", "ticks"),
            (50, "none", "trapezoid:1.5"),
            (50, "wander", "trapezoid:3"),
            (50, "edge", "trapezoid:3"),
            (50, "none", "rc:1"),
            (100, "small", "trapezoid:20"),
            (100, "both", "rc:5"),
        )
    ]
    grid += [
        Cell(rate=rate, noise=noise, bits=bits, n=n, edge=edge, timebase_rel=50e-6)
        for rate, noise, bits, n, edge in (
            (2000, "small", 8, 1, "trapezoid:300"),
            (2000, "small", 8, 10, "trapezoid:300"),
            (2000, "none", 6, 10, "trapezoid:300"),
            (2000, "none", 12, 10, "rc:60"),
            (2000, "both", 8, 30, "fast"),
            (500, "small", 12, 100, "rc:20"),
            (500, "none", 6, 100, "trapezoid:60"),
            (200, "none", 8, 100, "trapezoid:0.9"),
            (200, "none", 8, 100, "rc:0.5"),
            (8, "wander", 12, 300, "trapezoid:1.2"),
            (8, "both", 8, 1000, "logic"),
            (6, "small", 8, 300, "ticks"),
        )
    ]
    grid += [
        Cell(rate=rate, noise=noise, bits=8, n=n, edge="ticks", in_step=True)
        for rate, noise, n in (
            (20, "none", 30),
            (20, "none", 100),
            (50, "small", 100),
            (20, "edge", 30),
            (20, "none", 1000),
        )
    ]
    return grid


def main() -> None:
    """Print the table."""
    captures = int(sys.argv[1]) if len(sys.argv) > 1 else 1000
    processes = int(sys.argv[2]) if len(sys.argv) > 2 else 2
    print(f"{captures} captures a cell; coverage / U over what is needed")
    print(f"{'samples':>7} {'noise':>7} {'bits':>4} {'N':>5} {'edge':>14}", end="")
    print("".join(f"{name:>14}" for name in QUANTITIES))
    grid = cells()
    with Pool(processes) as pool:
        for cell, scores in zip(
            grid, pool.imap(partial(measure_cell, captures=captures), grid), strict=True
        ):
            edge = "ticks in step" if cell.in_step else cell.edge
            row = f"{cell.rate:7d} {cell.noise:>7} {cell.bits:4d} {cell.n:5d} {edge:>14}"
            row += "".join(f"{s.coverage:8.3f}/{s.excess:5.2f}" for s in scores.values())
            marks = [s.coverage < 0.93 for s in scores.values()]
            wide = [s.coverage > 0.985 and s.excess > 1.25 for s in scores.values()]
            print(row, "!" * sum(marks), "+" * sum(wide) if cell.n >= 30 else "", flush=True)


if __name__ == "__main__":
    main()
