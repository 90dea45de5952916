"""A wave of known content, and its rows as a bench would write them."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from read_back import times_of, values_of

from benchtool.model.arrays import AnyArray, FloatArray
from benchtool.model.capture import Capture, LogicTrace, StampedTime, Waveform

N = 240
DT_S = 5e-6
TIMES_S = np.arange(N) * DT_S
VOLTS = np.round(np.where(np.arange(N) // 17 % 2, 0.25, 4.75) + 0.01 * (np.arange(N) % 3), 2)
OTHER = np.round(np.where(np.arange(N) // 11 % 2, 0.1, 3.3) + 0.02 * (np.arange(N) % 5), 2)
S = [f"{t:.6f}" for t in TIMES_S]
US = [f"{t * 1e6:.0f}" for t in TIMES_S]
MS = [f"{t * 1e3:.3f}" for t in TIMES_S]
V = [f"{v:.2f}" for v in VOLTS]
W = [f"{v:.2f}" for v in OTHER]

EDGES_S = np.round(np.cumsum(np.tile([175e-6, 131e-6], 20)) + 1e-3, 7)
HIGH_AFTER = np.arange(EDGES_S.size) % 2 == 1
E = [f"{t:.7f}" for t in EDGES_S]
X = [f"{int(h)}" for h in HIGH_AFTER]


def lines(line: Callable[[int], str], n: int = N) -> str:
    """Return the rows ``line(0)`` to ``line(n - 1)``."""
    return "".join(line(i) + "\n" for i in range(n))


def rows(*columns: list[str], mark: str = ",") -> str:
    """Return columns of cells as rows."""
    return "".join(mark.join(row) + "\n" for row in zip(*columns, strict=True))


def comma(cells: list[str]) -> list[str]:
    """Return numbers with a decimal comma."""
    return [cell.replace(".", ",") for cell in cells]


def seconds_of(trace: object) -> FloatArray:
    """Return the time of every sample of a waveform, even or stamped."""
    assert isinstance(trace, Waveform)
    if isinstance(trace.time, StampedTime):
        return np.concatenate(list(trace.time.stamps.blocks())).astype(np.float64)
    return times_of(trace)


def is_wave(trace: object, times_s: AnyArray, values: AnyArray) -> bool:
    """Say whether a trace has these values at these times, from its first sample on."""
    found, at_s = values_of(trace), seconds_of(trace)
    if found.size != values.size:
        return False
    near_s = 1e-6 * float(times_s[-1] - times_s[0])  # of the nine digits kept of a step
    alike = np.allclose(found, values, atol=1e-9)
    return alike and bool(np.all(np.abs(at_s - at_s[0] - (times_s - times_s[0])) <= near_s))


def is_list(trace: object, times_s: AnyArray, high: AnyArray) -> bool:
    """Say whether a trace has these edges; the first may count as the state found."""
    if not isinstance(trace, LogicTrace) or times_s.size - trace.times_s.size not in (0, 1):
        return False
    n = trace.times_s.size
    lengths = np.allclose(np.diff(trace.times_s), np.diff(times_s[-n:]), atol=2e-7)  # two digits
    return bool(lengths) and trace.states.tolist() == [bool(h) for h in high[-n:]]


def named(capture: Capture, channel: str) -> object:
    """Return the trace of a channel."""
    return next(trace for trace in capture.traces if trace.channel == channel)
