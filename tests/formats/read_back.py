"""What was read, laid open for comparison."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from benchtool.model.arrays import FloatArray
from benchtool.model.capture import Capture, Waveform

Read = Callable[..., Capture]


def values_of(trace: object) -> FloatArray:
    """Return all samples of a waveform in its unit."""
    assert isinstance(trace, Waveform)
    codes = np.concatenate(list(trace.samples.blocks())).astype(np.float64)
    return codes * trace.scale.gain + trace.scale.offset


def times_of(trace: object) -> FloatArray:
    """Return the time of every sample of an even waveform."""
    assert isinstance(trace, Waveform)
    pieces = [
        span.start_s + np.arange(span.stop - span.start) * trace.time.dt_s  # type: ignore[union-attr]
        for span in trace.spans
    ]
    return np.concatenate(pieces)


def codes_of(capture: Capture) -> list[str]:
    """Return the codes of a capture's notices."""
    return [notice.code for notice in capture.warnings]


def point(capture: Capture, name: str) -> str:
    """Return the value of a structure point."""
    return next(p.value for p in capture.structure if p.name == name)
