"""Derivatives of a curve after its parameters, by differences."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from benchtool.model.arrays import FloatArray

Curve = Callable[[FloatArray], FloatArray]
"""Parameters, shape (p,), to values, shape (n,)."""

Slopes = Callable[[FloatArray], FloatArray]
"""Parameters, shape (p,), to derivatives, shape (n, p)."""

_STEP = 1e-3


def central_slopes(curve: Curve) -> Slopes:
    """Return the derivatives of a curve by central differences of the fourth order.

    References:
        f' = [8(f(+h) - f(-h)) - (f(+2h) - f(-2h))]/(12h), Abramowitz and Stegun 25.3.21; with h of
        1e-3 of the parameter what is left out is of the order of 1e-12 of it.
    """

    def slopes(values: FloatArray) -> FloatArray:
        columns = np.empty((0, 0))
        for index, value in enumerate(values):
            step = _STEP * (abs(float(value)) or 1.0)
            near = _difference(curve, values, index, step)
            far = _difference(curve, values, index, 2 * step)
            column = (8 * near - far) / (12 * step)
            if not index:
                columns = np.empty((column.size, values.size))
            columns[:, index] = column
        return columns

    return slopes


def _difference(curve: Curve, values: FloatArray, index: int, step: float) -> FloatArray:
    ahead, behind = values.copy(), values.copy()
    ahead[index] += step
    behind[index] -= step
    with np.errstate(all="ignore"):
        between: FloatArray = curve(ahead) - curve(behind)
    return between
