"""Which part of a record is measured."""

from __future__ import annotations

import math

from benchtool.frozen import frozen_record


@frozen_record
class Window:
    """A part of the record, in seconds after its first sample.

    Attributes:
        from_s: Where it begins.
        to_s: Where it ends; infinite for the record's own end.
    """

    from_s: float = 0.0
    to_s: float = math.inf

    def __post_init__(self) -> None:
        if not (0 <= self.from_s < self.to_s):
            raise ValueError(f"a window needs 0 <= from < to, got {self.from_s}, {self.to_s}")
