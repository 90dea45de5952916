"""The stretches in which a waveform rests in a state, without the edges at their ends."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from benchtool.model.capture import BoolArray, FloatArray

_MOST = 1024  # stretches of a state that are looked at, the longest first
_SETTLING = 0.4  # share at the start of a stretch that is left to settling
_LEAVING = 0.2  # share at its end that is left to the next edge
_TRIMMED = 0.05
_TRIMMED_SD = 0.8711  # sd of a normal deviate whose largest 5 % in size are left out


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Plateau:
    """The samples of one state, away from edges, in volts.

    Attributes:
        pieces: Stretches of consecutive samples.
        settling_v: Mean difference between their second and first halves.
    """

    pieces: tuple[FloatArray, ...]
    settling_v: float

    @property
    def values(self) -> FloatArray:
        """All samples in one row."""
        return np.concatenate(self.pieces) if self.pieces else np.empty(0)


def find_plateau(runs: Sequence[FloatArray], level_v: float, reach_v: float) -> Plateau:
    """Return the stretches within ``reach_v`` of a level, their ends trimmed.

    Args:
        runs: Contiguous samples in volts.
        level_v: The state level.
        reach_v: How far a sample may lie from it.
    """
    pieces: list[FloatArray] = []
    for run in runs:
        for start, stop in _stretches(np.abs(run - level_v) < reach_v):
            n = stop - start
            pieces.append(run[start + int(_SETTLING * n) : stop - int(_LEAVING * n)])
    pieces = sorted(pieces, key=len, reverse=True)[:_MOST]
    halves = [np.mean(p[len(p) // 2 :]) - np.mean(p[: len(p) // 2]) for p in pieces if len(p) > 3]
    return Plateau(pieces=tuple(pieces), settling_v=float(np.mean(halves)) if halves else 0.0)


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


def _stretches(inside: BoolArray) -> list[tuple[int, int]]:
    """Return the longest stretches of True, as index ranges."""
    ends = np.flatnonzero(np.diff(np.concatenate([[False], inside, [False]]).astype(np.int8)))
    pairs = ends.reshape(-1, 2)
    longest = np.argsort(pairs[:, 0] - pairs[:, 1], kind="stable")[:_MOST]
    return [(int(a), int(b)) for a, b in pairs[longest]]
