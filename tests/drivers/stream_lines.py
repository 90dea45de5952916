"""Lines of edges for the stream tests, and what they must give."""

from __future__ import annotations

from collections.abc import Iterable
from itertools import pairwise

import numpy as np

from benchtool.model.arrays import FloatArray
from benchtool.model.capture import Capture, LogicTrace
from benchtool_drivers.loopback.edge_printer import DeviceForm, Printer, StreamFault, print_edges
from benchtool_drivers.streams.capturing import capture_stretch
from benchtool_drivers.streams.intake import Intake
from benchtool_drivers.streams.layout import Layout
from benchtool_drivers.streams.window import EdgeWindow


def square_wave(n: int, high_s: float = 0.0007, low_s: float = 0.0003) -> FloatArray:
    """Return the times of ``n`` edges, the first one rising, on whole microseconds."""
    lengths = np.where(np.arange(n) % 2, high_s, low_s)
    return np.round(np.cumsum(lengths), 6)


def printed(
    times_s: Iterable[float], form: DeviceForm | None = None, *faults: StreamFault
) -> bytes:
    """Return the lines of a device for edges."""
    return b"".join(print_edges(Printer(form or DeviceForm(), faults), times_s))


def read_lines(text: bytes, layout: Layout | None = None, *, cuts: Iterable[int] = ()) -> Capture:
    """Return what lines give, read in the pieces that ``cuts`` make of them."""
    edges = EdgeWindow()
    intake = Intake("lines", layout, [edges], joined=False)
    bounds = [0, *sorted(cuts), len(text)]
    for start, stop in pairwise(bounds):
        intake.feed(text[start:stop])
    assert intake.layout is not None
    return capture_stretch(edges, intake.layout, "lines", decimals=intake.decimals, whole=True)


def trace_of(capture: Capture) -> LogicTrace:
    """Return the one trace of a capture."""
    trace = capture.traces[0]
    assert isinstance(trace, LogicTrace)
    return trace


def codes_of(capture: Capture) -> list[str]:
    """Return the codes of its warnings."""
    return [notice.code for notice in capture.warnings]


def interval_set(capture: Capture) -> set[tuple[int, bool]]:
    """Return each length between neighbouring edges of one span, in µs, and the level it had."""
    trace = trace_of(capture)
    found = set()
    for span in trace.spans:
        inside = (trace.times_s >= span.start_s) & (trace.times_s <= span.end_s)
        times_us = np.round(trace.times_s[inside] * 1e6).astype(int)
        levels = trace.states[inside][:-1]
        found |= set(zip(np.diff(times_us).tolist(), levels.tolist(), strict=True))
    return found
