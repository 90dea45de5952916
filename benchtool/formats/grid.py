"""Grids that values lie on: the tick of printed times and the step of quantised volts."""

from __future__ import annotations

from typing import Any

import numpy as np

from benchtool.model.arrays import FloatArray, NDArray, distinct

_FEW = 3  # below this number of times their greatest common divisor is chance
_LEAST_LEVELS = 5
_LEAST_STEPS = 8
_MOST_SAMPLES = 8192


def greatest_common_spacing(ticks: NDArray[np.int64]) -> int:
    """Return the greatest step, in counts, on which all ``ticks`` lie.

    One or two counts nearly always share a divisor by chance, so for so few only a power of
    ten is taken: trailing zeros that the writer added.

    Args:
        ticks: Times as whole counts of the printed unit, shape (n,).

    Example:
        >>> greatest_common_spacing(np.array([0, 40, 100, 160]))
        20
    """
    counts = distinct(np.abs(ticks[ticks != 0]))
    if counts.size == 0:
        return 1
    step = int(np.gcd.reduce(counts))
    return step if counts.size >= _FEW else _power_of_ten_in(step)


def _power_of_ten_in(step: int) -> int:
    power = 1
    while step % (power * 10) == 0:
        power *= 10
    return power


def code_step(codes: NDArray[Any]) -> float | None:
    """Return the step between integer codes: 1, or more where low bits are never used.

    Two clean levels show no step at all: None.
    """
    told = codes[:_MOST_SAMPLES]
    levels = distinct(told[np.isfinite(told)].astype(np.int64))
    if levels.size <= 2:
        return None
    step = int(np.gcd.reduce(np.diff(levels)))
    return float(step) if levels[-1] - levels[0] >= _LEAST_STEPS * step else 1.0


def value_step(values: FloatArray, printed: float | None) -> float | None:
    """Return the step on which sampled values lie, or None where they have none.

    Values of a converter printed with few digits lie on its steps to within the last digit;
    where no such steps show, the last printed digit itself is the step.

    Args:
        values: Samples in the file's unit, NaN allowed.
        printed: Size of the last printed digit in the same unit; None where it varies.
    """
    levels = distinct(values[np.isfinite(values)][:_MOST_SAMPLES])
    if levels.size < 2:
        return printed
    span = float(levels[-1] - levels[0])
    rounding = printed if printed is not None else 1e-9 * span
    return _converter_step(levels, rounding, span) or (
        printed if printed is not None and printed > 1e-7 * span else None
    )


def _converter_step(levels: FloatArray, rounding: float, span: float) -> float | None:
    """Fit a step to the distinct values; None where none fits or it is the rounding itself."""
    if levels.size < _LEAST_LEVELS:
        return None
    spacings = np.diff(levels)
    step = float(np.min(spacings))
    if step < 3 * rounding or span < _LEAST_STEPS * step:
        return None
    step = _refined(levels, step)
    offsets = levels - levels[0]
    misfit = np.abs(offsets - np.rint(offsets / step) * step)
    return step if float(np.max(misfit)) <= 1.05 * rounding + 1e-9 * span else None


def _refined(levels: FloatArray, step: float) -> float:
    """Sharpen a step from its nearest multiples outwards, so that rounding averages out."""
    offsets = levels - levels[0]
    reach = 4 * step
    while True:
        near = offsets[(offsets > 0) & (offsets <= reach)]
        counts = np.rint(near / step)
        step = float(np.sum(near * counts) / np.sum(counts * counts)) if near.size else step
        if reach >= offsets[-1]:
            return step
        reach *= 2
