"""What the first stamps of a column say of its steps."""

from __future__ import annotations

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, middle

_EVEN_SHARE = 0.8  # of the first steps must agree for the column to count as even


@frozen_record(eq=False)
class Steps:
    """What the first stamps of a column say of its steps, in the column's own unit.

    Attributes:
        typical: Median step.
        resolution: Last printed digit.
        even: Whether the steps agree to within the printed digits.
    """

    typical: float
    resolution: float
    even: bool

    @property
    def coarse(self) -> bool:
        """Whether the digits are too few to tell neighbouring stamps apart."""
        return self.typical < 1.5 * self.resolution

    @property
    def gap(self) -> float:
        """The step above which rows are missing."""
        return max(1.5 * self.typical, self.typical + 1.5 * self.resolution)


def examine_steps(stamps: FloatArray, resolution: float) -> Steps:
    """Look at the first stamps of a column.

    Args:
        stamps: The first rows, shape (n,), NaN allowed.
        resolution: Last printed digit in the same unit, 0 where unknown.
    """
    steps = np.diff(stamps[np.isfinite(stamps)])
    steps = steps[steps >= 0]
    if steps.size == 0:
        return Steps(typical=0.0, resolution=resolution, even=False)
    moving = steps if 2 * np.count_nonzero(steps) < steps.size else steps[steps > 0]
    typical = middle(moving)
    if typical < 1.5 * resolution:
        typical = middle(steps)
    near = np.abs(steps - typical) <= 1.01 * resolution + 0.02 * typical
    even = typical + resolution > 0 and np.count_nonzero(near) >= _EVEN_SHARE * steps.size
    return Steps(typical=typical, resolution=resolution, even=bool(even))
