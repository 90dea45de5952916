"""How far the quantities of a stage reach over its tolerances: corners, root sums, quantiles."""

from __future__ import annotations

import math
from collections.abc import Mapping

import numpy as np

from benchtool.circuits import Coordinate, coordinates
from benchtool.frozen import frozen_record
from benchtool.judge.responses import respond
from benchtool.model.arrays import FloatArray
from benchtool.model.design import Design, Stage

TRIALS = 1_000_000
TAIL = 0.00135
"""Probability beyond each Monte Carlo limit."""

_SEED = 20310302
_BLOCK = 1 << 16  # boards computed at a time: their rows stay in the cache


@frozen_record
class Extremes:
    """The range of each quantity over the boards that run.

    Attributes:
        ranges: Quantity to (lower, upper) in SI units; not finite where no board runs.
        stopped: How many boards stand still, in words; empty where all run or too few stop to
            move a limit.
    """

    ranges: Mapping[str, tuple[float, float]]
    stopped: str


def find_corners(stage: Stage, design: Design) -> Extremes:
    """Return the range over every corner of the coordinates' ranges.

    All 2^n corners are computed, for n up to 16 in 20 ms, so nothing rests on a quantity being
    monotonic in a coordinate beyond its range's ends.

    Args:
        stage: A stage of ``design``.
        design: Gives supply, temperature and probe.
    """
    axes = coordinates(stage, design)
    total = 1 << len(axes)
    blocks = (
        _respond_at_corners(stage, design, axes, start, min(start + _BLOCK, total))
        for start in range(0, total, _BLOCK)
    )
    ranges: dict[str, tuple[float, float]] = {}
    stuck = 0
    for rows in blocks:
        stuck += max(int(np.isnan(row).sum()) for row in rows.values())
        for name, row in rows.items():
            low, high = ranges.get(name, (math.inf, -math.inf))
            ranges[name] = (float(np.fmin.reduce(row, initial=low)), _highest(row, high))
    return Extremes(ranges=ranges, stopped=f"{stuck} of {total} corners" if stuck else "")


def _highest(row: FloatArray, known: float) -> float:
    return float(np.fmax.reduce(row, initial=known))


def _respond_at_corners(
    stage: Stage, design: Design, axes: tuple[Coordinate, ...], start: int, stop: int
) -> dict[str, FloatArray]:
    """Return the rows of corners ``start`` to ``stop``; bit k of a corner's number is axis k."""
    index = np.arange(start, stop)
    point = {
        axis.name: np.where((index >> bit) & 1, axis.upper, axis.lower)
        for bit, axis in enumerate(axes)
    }
    return respond(stage, design, point, size=stop - start)


def find_root_sums(stage: Stage, design: Design) -> Extremes:
    """Return nominal ± √Σ(½(y₊ − y₋))², each coordinate moved alone to both ends of its range.

    Args:
        stage: A stage of ``design``.
        design: Gives supply, temperature and probe.
    """
    axes = coordinates(stage, design)
    n = len(axes)
    ends = np.tile(np.array([axis.centre for axis in axes]), (2 * n + 1, 1))
    for k, axis in enumerate(axes):
        ends[2 * k, k], ends[2 * k + 1, k] = axis.lower, axis.upper
    point = {axis.name: ends[:, k] for k, axis in enumerate(axes)}
    rows = respond(stage, design, point, size=2 * n + 1)
    stuck = np.any([np.isnan(row) for row in rows.values()], axis=0)
    names = [axis.name for k, axis in enumerate(axes) if stuck[2 * k : 2 * k + 2].any()]
    at_end = f"{' or '.join(names)} at an end of its range" if names else ""
    return Extremes(
        ranges={name: _root_sum(row) for name, row in rows.items()},
        stopped="the nominal board" if stuck[-1] else at_end,
    )


def _root_sum(row: FloatArray) -> tuple[float, float]:
    """Return the nominal value, last in the row, ± the root sum over pairs of ends.

    Where one end is stuck the change to the other stands for half the change over the range.
    """
    nominal = float(row[-1])
    below, above = nominal - row[:-1:2], row[1:-1:2] - nominal
    below, above = np.where(np.isnan(below), above, below), np.where(np.isnan(above), below, above)
    half = math.sqrt(float((((below + above) / 2) ** 2).sum()))
    return nominal - half, nominal + half


def find_quantiles(stage: Stage, design: Design) -> Extremes:
    """Return the 0.135 % and 99.865 % quantiles of a million random boards.

    Args:
        stage: A stage of ``design``.
        design: Gives supply, temperature and probe.
    """
    rows = draw_boards(stage, design, TRIALS)
    stuck = max(int(np.isnan(row).sum()) for row in rows.values())
    share = stuck / TRIALS
    return Extremes(
        ranges={name: _quantiles(row, name) for name, row in rows.items()},
        stopped=f"{100 * share:.3g} % of the boards" if share >= TAIL else "",
    )


def _quantiles(row: FloatArray, name: str) -> tuple[float, float]:
    """Return both tail quantiles; a board that is stuck counts as infinitely slow."""
    row[np.isnan(row)] = -math.inf if name == "frequency" else math.inf
    low = math.ceil(TAIL * row.size) - 1
    high = row.size - 1 - low
    row.partition((low, high))
    return float(row[low]), float(row[high])


def draw_boards(stage: Stage, design: Design, trials: int) -> dict[str, FloatArray]:
    """Return every quantity of random boards: rectangular parts, normal IC terms, a fixed seed.

    Args:
        stage: A stage of ``design``.
        design: Gives supply, temperature and probe.
        trials: Number of boards.

    Returns:
        Quantity to a row of shape (trials,); NaN where a board is stuck. Boards are computed in
        blocks, so the memory is that of the rows alone: 8 MB a quantity for a million.

    References:
        JCGM 101:2008, 6.4.2 (rectangular) and 6.4.7 (normal).
    """
    rng = np.random.default_rng(_SEED)
    axes = coordinates(stage, design)
    rows: dict[str, FloatArray] = {}
    for start in range(0, trials, _BLOCK):
        size = min(_BLOCK, trials - start)
        point = {axis.name: _draw(axis, size, rng) for axis in axes}
        for name, row in respond(stage, design, point, size=size).items():
            rows.setdefault(name, np.empty(trials))[start : start + size] = row
    return rows


def _draw(axis: Coordinate, size: int, rng: np.random.Generator) -> FloatArray:
    if axis.law == "normal":
        return rng.normal(axis.centre, axis.u, size)
    return rng.uniform(axis.lower, axis.upper, size)
