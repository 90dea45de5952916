"""Sizes of a fault: from the effect on the times to the fault's own unit, on a fine grid."""

from __future__ import annotations

import math
from collections.abc import Iterator
from itertools import pairwise

import numpy as np

from benchtool.circuits import predict
from benchtool.circuits.circuit import Circuit
from benchtool.circuits.fault_entry import Fault
from benchtool.diagnose.priors import Prior, SizeLaw
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray

_POINTS = 1600
_LEAST_SHARE, _FALL, _RISE = 1e-4, 0.999, 1e4
_WIDE = (1e-5, 1e4)  # multiples of a fault's usual sizes between which its effect is looked up
_OWN_POINTS = 60
_PEAK_WIDTH = 0.1  # of the logarithm
_ELSEWHERE = 0.2  # share of sizes that lie at no peak, where there are peaks: assumed
_TIMES = ("t_high", "t_low", "delay", "period")
_TAIL_STEPS = 4  # the grid is this much coarser outside the usual range


@frozen_record(eq=False)
class Sizes:
    """A grid of sizes.

    Attributes:
        values: In the fault's unit, shape (n,).
        weights: Share of each; their sum is 1, or less where large sizes are rare.
        ends: Where an unbroken stretch begins, and n at last: neighbours across do not touch.
    """

    values: FloatArray
    weights: FloatArray
    ends: tuple[int, ...]

    def halves(self) -> Iterator[slice]:
        """Yield the unbroken stretches."""
        yield from (slice(*pair) for pair in pairwise(self.ends))


def sizes_of(fault: Fault, prior: Prior, circuit: Circuit, law: SizeLaw) -> Sizes | None:
    """Return the grid of sizes of a fault on a board, None where none has such an effect.

    Args:
        fault: The fault.
        prior: What is held of it.
        circuit: The nominal board, all floats.
        law: How large effects are.
    """
    if not fault.unit:
        return Sizes(values=np.zeros(1), weights=np.ones(1), ends=(0, 1))
    if not prior.by_effect:
        return _own_range(fault, prior, circuit)
    branches = [
        found
        for grid in _branches(fault, circuit)
        if (found := _branch(fault, prior, circuit, law, grid))
    ]
    if not branches:
        return None
    counts = [values.size for values, _ in branches]
    return Sizes(
        values=np.concatenate([values for values, _ in branches]),
        weights=np.concatenate([weights for _, weights in branches]) / len(branches),
        ends=tuple(int(end) for end in np.cumsum([0, *counts])),
    )


def _own_range(fault: Fault, prior: Prior, circuit: Circuit) -> Sizes:
    lower, upper = (edge * float(fault.reference(circuit)) for edge in fault.sizes)
    if lower > 0:
        values = np.geomspace(lower, upper, _OWN_POINTS)
    else:
        values = np.linspace(lower, upper, _OWN_POINTS)
    weights = np.full(_OWN_POINTS, 1 / _OWN_POINTS)
    if prior.peaks:
        off = np.log(values[:, None] / np.array(prior.peaks)) / _PEAK_WIDTH
        near = np.exp(-(off**2) / 2)
        weights = _ELSEWHERE * weights + (1 - _ELSEWHERE) * (near / near.sum(axis=0)).mean(axis=1)
    return Sizes(values=values, weights=weights, ends=(0, _OWN_POINTS))


def _branches(fault: Fault, circuit: Circuit) -> Iterator[FloatArray]:
    """Yield grids of sizes away from the healthy board, one for each sign."""
    lower, upper = fault.sizes
    if fault.unit == "1":
        if lower < 0:
            yield -np.geomspace(_LEAST_SHARE, _FALL, _POINTS)
        if upper > 0:
            yield np.geomspace(_LEAST_SHARE, _RISE, _POINTS)
        return
    reference = float(fault.reference(circuit))
    grid = np.geomspace(lower * reference * _WIDE[0], upper * reference * _WIDE[1], 2 * _POINTS)
    yield grid if _grows(fault, circuit, reference) else grid[::-1]


def _grows(fault: Fault, circuit: Circuit, reference: float) -> bool:
    """Return whether a larger size does more; a parallel resistance does less."""
    small, large = (np.array([edge * reference]) for edge in fault.sizes)
    less, more = (float(effects(fault, circuit, size)[0]) for size in (small, large))
    return math.isnan(more) or more > less


def effects(fault: Fault, circuit: Circuit, sizes: FloatArray) -> FloatArray:
    """Return the larger |change of ln t| of the times for each size, NaN where one ends."""
    healthy, faulty = predict(circuit), predict(fault.move.act(circuit, sizes))
    changes: list[FloatArray] = []
    for name in _TIMES:
        before, after = getattr(healthy, name), getattr(faulty, name)
        if before is not None and (name != "period" or not changes):
            with np.errstate(all="ignore"):
                changes.append(np.abs(np.log(np.broadcast_to(after, sizes.shape) / before)))
    largest: FloatArray = np.max(changes, axis=0)
    return largest


def _branch(
    fault: Fault, prior: Prior, circuit: Circuit, law: SizeLaw, grid: FloatArray
) -> tuple[FloatArray, FloatArray] | None:
    effect = effects(fault, circuit, grid)
    allowed = np.isfinite(effect) & (moved_figure(fault, circuit, grid) >= prior.least)
    stop = int(np.argmin(allowed)) if not allowed.all() else allowed.size
    effect, grid = effect[:stop], grid[:stop]
    rising = effect > 0
    rising[1:] &= effect[1:] > np.maximum.accumulate(effect)[:-1]
    effect, grid = effect[rising], grid[rising]
    if effect.size < 2:
        return None
    at, weights = _effect_grid(law, float(effect[-1]))
    if not at.size:
        return None
    logs = np.interp(np.log(at), np.log(effect), np.log(np.abs(grid)))
    values = math.copysign(1.0, grid[0]) * np.exp(logs)
    rarer = prior.rare_beyond / moved_figure(fault, circuit, values)
    return values, weights * np.minimum(rarer, 1.0)


def moved_figure(fault: Fault, circuit: Circuit, sizes: FloatArray) -> FloatArray:
    """Return the figure that a fault moves, for each size."""
    value = getattr(fault.move.act(circuit, sizes), fault.move.fields[0])
    figure: FloatArray = np.broadcast_to(value, sizes.shape)
    return figure


def _effect_grid(law: SizeLaw, largest: float) -> tuple[FloatArray, FloatArray]:
    """Return effects and their shares: log-uniform in the usual range, thin outside."""
    stretches = [
        (law.lower, law.upper, 1 - law.tail, law.step),
        (law.upper, law.most, law.tail, law.step * _TAIL_STEPS),
    ]
    grids, weights = [], []
    for lower, upper, share, step in stretches:
        top = min(upper, largest)
        if share <= 0 or top <= lower:
            continue
        count = max(1, math.ceil(math.log(top / lower) / step))
        middles = (np.arange(count) + 0.5) / count
        grids.append(lower * (top / lower) ** middles)
        weights.append(np.full(count, share / count))
    if not grids:
        return np.zeros(0), np.zeros(0)
    joined = np.concatenate(weights)
    return np.concatenate(grids), joined / joined.sum()
