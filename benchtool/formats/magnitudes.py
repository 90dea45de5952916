"""Between what sizes a stored number can be a voltage or a time."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from benchtool.model.arrays import NDArray

OVERFLOW = 9.9e37
"""A number this large stands for an overflow and not for a voltage or a time.

References:
    SCPI-99, vol. 1, 7.2.1.4 and 7.2.1.5: infinity is sent as 9.9E37, not-a-number as 9.91E37.
"""
NOTHING = 1 / OVERFLOW
"""A number this small is 0 in every unit; its square or inverse leaves the range of a float."""


def in_range(value: float) -> float:
    """Return a number, NaN for one too large and 0 for one too small to be a value."""
    if not abs(value) < OVERFLOW:
        return math.nan
    return value if abs(value) >= NOTHING else 0.0


def bounded(values: NDArray[Any]) -> NDArray[Any]:
    """Return floats with NaN for what is too large and 0 for what is too small to be a value.

    Other types are returned as they are, and so are floats of 16 bits without infinities.
    """
    if values.dtype.kind != "f" or not values.size:
        return values
    if values.dtype.itemsize == 2:
        too_large = np.isinf(values)
        return np.where(too_large, np.float16(np.nan), values) if too_large.any() else values
    size = np.abs(values)
    too_large, too_small = size >= OVERFLOW, (size < NOTHING) & (size > 0)
    if not (too_large.any() or too_small.any()):
        return values
    kept = np.where(too_small, 0, values)
    return np.where(too_large, np.nan, kept).astype(values.dtype)
