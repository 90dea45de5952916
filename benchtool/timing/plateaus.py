"""The stretches in which a waveform rests in a state, without the edges at their ends."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, FloatArray, IntArray, distinct

_MOST = 1024  # stretches of a state that are looked at, the longest first
_SETTLING, _LEAVING = 0.4, 0.2  # shares at the ends of a stretch that noise is not taken from
_SETTLED, _STAYING = 0.6, 0.25  # the same for the level of a state that settles late
_LEAST_SETTLED = 4  # samples of a stretch whose halves are compared
_TRIMMED = 0.05
_TRIMMED_SD = 0.8711  # sd of a normal deviate whose largest 5 % in size are left out


@frozen_record(eq=False)
class Stretches:
    """Stretches of consecutive samples.

    Attributes:
        values: The samples that they lie in, in volts, shape (n,).
        starts, stops: The first sample of each, and one past the last.
    """

    values: FloatArray
    starts: IntArray
    stops: IntArray

    def joined(self) -> FloatArray:
        """Return the samples of all of them, one after another."""
        ends = zip(self.starts.tolist(), self.stops.tolist(), strict=True)
        return np.concatenate([np.empty(0), *[self.values[a:b] for a, b in ends]])

    def trimmed(self, start: float, end: float) -> Stretches:
        """Return them without a share of each at both ends."""
        sizes = self.stops - self.starts
        return replace(
            self,
            starts=self.starts + (start * sizes).astype(np.int64),
            stops=self.stops - (end * sizes).astype(np.int64),
        )


@frozen_record(eq=False)
class Plateau:
    """The samples of one state, away from edges, in volts.

    Attributes:
        stretches: Where they are.
        settled: What of them is left when the state has settled, shape (n,).
        settling_v: Mean difference between second and first half of the settled parts, 0 where
            it is no more than noise.
    """

    stretches: Stretches
    settled: FloatArray
    settling_v: float


def whole_runs(runs: Sequence[FloatArray]) -> Stretches:
    """Return contiguous runs of samples, each as one stretch."""
    until = np.cumsum([0, *(run.size for run in runs)])
    values = np.concatenate([np.empty(0), *runs])
    return Stretches(values=values, starts=until[:-1], stops=until[1:])


def find_plateau(runs: Stretches, level_v: float, reach_v: float) -> Plateau:
    """Return the stretches within ``reach_v`` of a level, their ends trimmed.

    Args:
        runs: Contiguous samples in volts.
        level_v: The state level.
        reach_v: How far a sample may lie from it.
    """
    whole = _longest(runs, np.abs(runs.values - level_v) < reach_v)
    settled = whole.trimmed(_SETTLING, _STAYING)
    settling_v = _settling(settled)
    if settling_v:
        settled = whole.trimmed(_SETTLED, _STAYING)
        settling_v = _settling(settled)
    return Plateau(
        stretches=whole.trimmed(_SETTLING, _LEAVING),
        settled=settled.joined(),
        settling_v=settling_v,
    )


def values_beyond(runs: Stretches, middle_v: float, *, above: bool) -> FloatArray:
    """Return the samples on one side of the middle, those near the crossings left out.

    Args:
        runs: Contiguous samples in volts.
        middle_v: The middle between the states.
        above: Which side.
    """
    inside = (runs.values > middle_v) == above
    return _longest(runs, inside).trimmed(_SETTLING, _LEAVING).joined()


def _longest(runs: Stretches, inside: BoolArray) -> Stretches:
    """Return the longest stretches of each run that are inside, and the longest of all first."""
    begins, ends = inside.copy(), inside.copy()
    np.greater(inside[1:], inside[:-1], out=begins[1:])
    np.greater(inside[:-1], inside[1:], out=ends[:-1])
    begins[runs.starts] = inside[runs.starts]
    ends[runs.stops - 1] = inside[runs.stops - 1]
    starts, stops = begins.nonzero()[0], ends.nonzero()[0] + 1
    run = np.searchsorted(runs.starts, starts, side="right")
    order = np.lexsort((starts - stops, run))
    rank = np.arange(order.size) - np.searchsorted(run, run)
    kept = np.sort(order[rank < max(8, _MOST // max(1, runs.starts.size))])
    kept = kept[np.argsort((starts - stops)[kept], kind="stable")][:_MOST]
    return Stretches(values=runs.values, starts=starts[kept], stops=stops[kept])


def _settling(stretches: Stretches) -> float:
    """Return how far the state still moves from one half of a settled part to the other."""
    halves = _differences_of_halves(stretches)
    if halves.size == 0:
        return 0.0
    mean = float(np.mean(halves))
    noise = float(np.std(halves)) / math.sqrt(halves.size) if halves.size > 1 else abs(mean)
    return mean if abs(mean) > noise else 0.0


def _differences_of_halves(stretches: Stretches) -> FloatArray:
    """Return the mean of the second half less that of the first; those of one size at once."""
    values, sizes = stretches.values, stretches.stops - stretches.starts
    found = np.empty(sizes.size)
    for size in distinct(sizes[sizes >= _LEAST_SETTLED]).tolist():
        alike, half = (sizes == size).nonzero()[0], size // 2
        windows = np.ndarray((values.size - size + 1, size), np.float64, values.data, 0, (8, 8))
        rows = windows[stretches.starts[alike]]
        first, second = rows[:, :half].sum(axis=1), rows[:, half:].sum(axis=1)
        found[alike] = second / (size - half) - first / half
    return found[sizes >= _LEAST_SETTLED]


def local_noise(*parts: Stretches) -> float:
    """Return the noise of a trace from the differences of neighbouring samples.

    The largest twentieth of the differences is left out; slow changes such as ripple do not
    count.

    Args:
        parts: Contiguous samples in volts.
    """
    return _trimmed_sd([_differences(part) for part in parts]) / math.sqrt(2)


def curved_noise(part: Stretches) -> float:
    """Return the noise from second differences, which straight ramps do not raise.

    Args:
        part: Contiguous samples in volts.
    """
    return _trimmed_sd([_differences(part, 2)]) / math.sqrt(6)


def _differences(part: Stretches, n: int = 1) -> FloatArray:
    """Return the n-th differences within the stretches."""
    stops = np.maximum(part.stops - n, part.starts)
    return replace(part, values=np.diff(part.values, n), stops=stops).joined()


def _trimmed_sd(steps: Sequence[FloatArray]) -> float:
    sizes = np.sort(np.abs(np.concatenate([np.empty(0), *steps])))
    if sizes.size == 0:
        return 0.0
    kept = sizes[: max(1, math.ceil(sizes.size * (1 - _TRIMMED)))]
    return float(np.sqrt(np.mean(kept**2))) / _TRIMMED_SD
