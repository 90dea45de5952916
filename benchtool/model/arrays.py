"""Array types, spelled out for type checkers alone: ``numpy.typing`` takes 20 ms to load."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

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

__all__ = ["AnyArray", "BoolArray", "FloatArray", "IntArray", "NDArray"]
