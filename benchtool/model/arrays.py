"""Array types, and functions by which numpy loads no more of itself than is needed.

``numpy.typing`` takes 20 ms to load, and masked arrays, which ``numpy.median``, ``numpy.quantile``
and ``numpy.unique`` import on their first call, as long again.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, TypeVar

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray
else:

    class NDArray:
        """Stands in for ``numpy.typing.NDArray`` at run time, where it is only an annotation."""

        def __class_getitem__(cls, _: Any) -> type[np.ndarray]:
            return np.ndarray


FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
IntArray = NDArray[np.int64]
AnyArray = NDArray[np.generic]

_Number = TypeVar("_Number", np.int64, np.float64)


def distinct(values: NDArray[_Number]) -> NDArray[_Number]:
    """Return the different values in order, as ``numpy.unique`` does."""
    return without_repeats(np.sort(values))


def without_repeats(ordered: NDArray[_Number]) -> NDArray[_Number]:
    """Return the different values of some that are in order."""
    return ordered[np.append(ordered[1:] != ordered[:-1], True)] if ordered.size else ordered


def middle(values: FloatArray) -> float:
    """Return the median of at least one value, as ``numpy.median`` does."""
    ordered = np.sort(values)
    return float(ordered[(ordered.size - 1) // 2] + ordered[ordered.size // 2]) / 2


def quantile(values: FloatArray, share: float) -> float:
    """Return the value below which lies a share of at least one value.

    As ``numpy.quantile`` does by default, linear between neighbours.

    Args:
        values: Shape (n,), n >= 1.
        share: From 0 to 1.
    """
    place = share * (values.size - 1)
    low = int(place)
    high = min(low + 1, values.size - 1)
    sorted_there = np.partition(values, (low, high))
    return float(sorted_there[low] + (place - low) * (sorted_there[high] - sorted_there[low]))


__all__ = [
    "AnyArray",
    "BoolArray",
    "FloatArray",
    "IntArray",
    "NDArray",
    "distinct",
    "middle",
    "quantile",
    "without_repeats",
]
