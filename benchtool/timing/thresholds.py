"""Reference levels in the unit of the stored samples."""

from __future__ import annotations

import math

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.capture import Waveform
from benchtool.model.timing import Levels


@frozen_record(eq=False)
class Thresholds:
    """Reference levels in the unit of the stored samples.

    Attributes:
        lower, mid, upper: The levels.
        inverted: Whether a greater code is a lower voltage.
        rests_below: Greatest value of the samples' own type that is at or below ``lower``.
        is_above: Least value of that type at or above ``mid``.
        rests_above: Least value of that type at or above ``upper``.
    """

    lower: float
    mid: float
    upper: float
    inverted: bool
    rests_below: float
    is_above: float
    rests_above: float


def thresholds(waveform: Waveform, levels: Levels) -> Thresholds:
    """Return the reference levels in codes.

    A sample compared with a number of its own type gives what the exact level gives, and a wider
    number would slow the comparison threefold.
    """
    gain, offset, dtype = waveform.scale.gain, waveform.scale.offset, waveform.samples.dtype
    lower, mid, upper = sorted(
        (v - offset) / gain for v in (levels.lower_v, levels.mid_v, levels.upper_v)
    )
    return Thresholds(
        lower=lower,
        mid=mid,
        upper=upper,
        inverted=gain < 0,
        rests_below=-_at_or_above(-lower, dtype),
        is_above=_at_or_above(mid, dtype),
        rests_above=_at_or_above(upper, dtype),
    )


def _at_or_above(level: float, dtype: np.dtype[np.generic]) -> float:
    """Return the least number of a type at or above a level: a Python int for codes."""
    if dtype.kind != "f":
        return math.ceil(level)
    number = dtype.newbyteorder("=").type
    near = number(level)
    return float(near if float(near) >= level else np.nextafter(near, number(np.inf)))
