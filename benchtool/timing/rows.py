"""Least and greatest of short rows of samples: enough to tell which rows need a closer look."""

from __future__ import annotations

from typing import Any

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import NDArray

ROW = 2048
"""Samples in a row: long enough that numpy's overhead a row is small, short enough to skip well."""

Codes = NDArray[Any]
"""Samples as stored: integer codes, or floating volts."""


@frozen_record(eq=False)
class Rows:
    """Extremes of consecutive rows of ``ROW`` samples; the last row may be shorter.

    A missing sample makes both extremes of its row NaN, an infinite one makes one infinite.

    Attributes:
        least, greatest: Of each row, shape (n,).
    """

    least: Codes
    greatest: Codes

    @property
    def are_whole(self) -> bool:
        """Whether every sample is a finite number."""
        if self.least.dtype.kind != "f":
            return True
        return bool(np.isfinite(self.least).all() and np.isfinite(self.greatest).all())


def find_rows(values: Codes) -> Rows:
    """Return the extremes of each row of at least one sample: two passes in cache."""
    starts = np.arange(0, values.size, ROW)
    return Rows(
        least=np.minimum.reduceat(values, starts), greatest=np.maximum.reduceat(values, starts)
    )
