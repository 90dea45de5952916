"""The stretches in which a waveform rests in a state, without the edges at their ends."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, FloatArray

_MOST = 1024  # stretches of a state that are looked at, the longest first
_SETTLING, _LEAVING = 0.4, 0.2  # shares at the ends of a stretch that noise is not taken from
_SETTLED, _STAYING = 0.6, 0.25  # the same for the level of a state that settles late
_TRIMMED = 0.05
_TRIMMED_SD = 0.8711  # sd of a normal deviate whose largest 5 % in size are left out


@frozen_record(eq=False)
class Plateau:
    """The samples of one state, away from edges, in volts.

    Attributes:
        pieces: Stretches of consecutive samples.
        settled: What of them is left when the state has settled, shape (n,).
        settling_v: Mean difference between second and first half of the settled parts, 0 where
            it is no more than noise.
    """

    pieces: tuple[FloatArray, ...]
    settled: FloatArray
    settling_v: float


def find_plateau(runs: Sequence[FloatArray], level_v: float, reach_v: float) -> Plateau:
    """Return the stretches within ``reach_v`` of a level, their ends trimmed.

    Args:
        runs: Contiguous samples in volts.
        level_v: The state level.
        reach_v: How far a sample may lie from it.
    """
    whole = _longest(runs, [np.abs(run - level_v) < reach_v for run in runs])
    settled = [_trimmed(piece, _SETTLING, _STAYING) for piece in whole]
    if _settling(settled):
        settled = [_trimmed(piece, _SETTLED, _STAYING) for piece in whole]
    return Plateau(
        pieces=tuple(_trimmed(piece, _SETTLING, _LEAVING) for piece in whole),
        settled=np.concatenate([np.empty(0), *settled]),
        settling_v=_settling(settled),
    )


def values_beyond(runs: Sequence[FloatArray], middle_v: float, *, above: bool) -> FloatArray:
    """Return the samples on one side of the middle, those near the crossings left out.

    Args:
        runs: Contiguous samples in volts.
        middle_v: The middle between the states.
        above: Which side.
    """
    pieces = _longest(runs, [(run > middle_v) == above for run in runs])
    inner = [_trimmed(piece, _SETTLING, _LEAVING) for piece in pieces]
    return np.concatenate([np.empty(0), *inner])


def _longest(runs: Sequence[FloatArray], inside: Sequence[BoolArray]) -> list[FloatArray]:
    most = max(8, _MOST // max(1, len(runs)))
    whole = [
        run[start:stop]
        for run, chosen in zip(runs, inside, strict=True)
        for start, stop in _stretches(chosen, most)
    ]
    return sorted(whole, key=len, reverse=True)[:_MOST]


def _trimmed(piece: FloatArray, start: float, end: float) -> FloatArray:
    n = piece.size
    return piece[int(start * n) : n - int(end * n)]


def _settling(pieces: Sequence[FloatArray]) -> float:
    """Return how far the state still moves from one half of a settled part to the other."""
    halves = np.array([_difference_of_halves(piece) for piece in pieces if piece.size > 3])
    if halves.size == 0:
        return 0.0
    mean = float(np.mean(halves))
    noise = float(np.std(halves)) / math.sqrt(halves.size) if halves.size > 1 else abs(mean)
    return mean if abs(mean) > noise else 0.0


def _difference_of_halves(piece: FloatArray) -> float:
    """Return the mean of the second half less that of the first; sums cost a third of means."""
    half = piece.size // 2
    return float(piece[half:].sum() / (piece.size - half) - piece[:half].sum() / half)


def local_noise(pieces: Sequence[FloatArray]) -> float:
    """Return the noise of a trace from the differences of neighbouring samples.

    The largest twentieth of the differences is left out; slow changes such as ripple do not
    count.

    Args:
        pieces: Contiguous samples in volts.
    """
    return _trimmed_sd([np.diff(piece) for piece in pieces]) / math.sqrt(2)


def curved_noise(pieces: Sequence[FloatArray]) -> float:
    """Return the noise from second differences, which straight ramps do not raise.

    Args:
        pieces: Contiguous samples in volts.
    """
    return _trimmed_sd([np.diff(piece, 2) for piece in pieces]) / math.sqrt(6)


def _trimmed_sd(steps: Sequence[FloatArray]) -> float:
    sizes = np.sort(np.abs(np.concatenate([np.empty(0), *steps])))
    if sizes.size == 0:
        return 0.0
    kept = sizes[: max(1, math.ceil(sizes.size * (1 - _TRIMMED)))]
    return float(np.sqrt(np.mean(kept**2))) / _TRIMMED_SD


def _stretches(inside: BoolArray, most: int) -> list[tuple[int, int]]:
    """Return the longest stretches of True, as index ranges."""
    ends = np.flatnonzero(np.diff(np.concatenate([[False], inside, [False]]).astype(np.int8)))
    pairs = ends.reshape(-1, 2)
    longest = np.argsort(pairs[:, 0] - pairs[:, 1], kind="stable")[:most]
    return [(int(a), int(b)) for a, b in pairs[longest]]
