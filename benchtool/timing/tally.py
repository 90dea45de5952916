"""What a walk over all samples notes on the way: their range, and how many are missing."""

from __future__ import annotations

import numpy as np

from benchtool.model.capture import Scale
from benchtool.timing.rows import Codes, Rows


class Tally:
    """Range of all present samples in stored units, and the number of missing ones."""

    def __init__(self) -> None:
        self.least = np.inf
        self.greatest = -np.inf
        self.n_missing = 0

    def add_rows(self, rows: Rows) -> None:
        """Note samples that are all there, by the extremes of their rows."""
        self.least = min(self.least, float(rows.least.min()))
        self.greatest = max(self.greatest, float(rows.greatest.max()))

    def add_holed(self, values: Codes) -> None:
        """Note samples some of which are missing."""
        present = values[np.isfinite(values)]
        self.n_missing += values.size - present.size
        if present.size:
            self.least = min(self.least, float(present.min()))
            self.greatest = max(self.greatest, float(present.max()))

    def volts(self, scale: Scale) -> tuple[float, float]:
        """Return the range in volts."""
        low, high = sorted(x * scale.gain + scale.offset for x in (self.least, self.greatest))
        return low, high
