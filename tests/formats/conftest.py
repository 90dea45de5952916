"""Captures with known content, printed in many structures."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from benchtool.formats import read_capture
from benchtool.model.capture import Capture, FloatArray, ReadOptions, Waveform

Read = Callable[..., Capture]


@pytest.fixture
def read(tmp_path: Path) -> Read:
    """Write bytes or text to a file and read it as a capture."""

    def write_and_read(
        content: str | bytes, name: str = "capture.csv", *, limit: int = 1 << 20, **options: object
    ) -> Capture:
        path = tmp_path / name
        path.write_bytes(content.encode() if isinstance(content, str) else content)
        return read_capture(path, ReadOptions(**options), in_memory_bytes=limit)  # type: ignore[arg-type]

    return write_and_read


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
