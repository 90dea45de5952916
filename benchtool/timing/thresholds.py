"""Reference levels in the unit of the stored samples."""

from __future__ import annotations

from benchtool.frozen import frozen_record
from benchtool.model.capture import Waveform
from benchtool.model.timing import Levels


@frozen_record(eq=False)
class Thresholds:
    """Reference levels in the unit of the stored samples.

    ``inverted`` says that a greater code is a lower voltage.
    """

    lower: float
    mid: float
    upper: float
    inverted: bool


def thresholds(waveform: Waveform, levels: Levels) -> Thresholds:
    """Return the reference levels in codes."""
    gain, offset = waveform.scale.gain, waveform.scale.offset
    codes = sorted((v - offset) / gain for v in (levels.lower_v, levels.mid_v, levels.upper_v))
    return Thresholds(lower=codes[0], mid=codes[1], upper=codes[2], inverted=gain < 0)
