"""Writing logic traces as a value change dump (IEEE 1364-2005, clause 18)."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import BinaryIO

import numpy as np

from benchtool.errors import UsageError
from benchtool.formats.sink import opened
from benchtool.model.capture import Capture, LogicTrace

_SCALES = [
    (unit, multiple, power + zeros)
    for unit, power in (("s", 0), ("ms", -3), ("us", -6), ("ns", -9), ("ps", -12), ("fs", -15))
    for multiple, zeros in ((100, 2), (10, 1), (1, 0))
]
_NEAR = 1e-6


def write_vcd(capture: Capture, file: BinaryIO | Path) -> None:
    """Write the logic traces of a capture; a gap is written as ``x``.

    Args:
        capture: Logic traces.
        file: Binary file object, or path of the file to write.

    Raises:
        UsageError: If a trace is none of logic.
    """
    traces = [trace for trace in capture.traces if isinstance(trace, LogicTrace)]
    if len(traces) != len(capture.traces):
        raise UsageError(
            "a value change dump holds logic only", hint="Write waveforms as .csv or .npz."
        )
    with opened(file) as stream:
        for line in _lines(traces):
            stream.write(line.encode("utf-8") + b"\n")


def _lines(traces: list[LogicTrace]) -> Iterator[str]:
    unit, multiple, power = _timescale(traces)
    yield f"$timescale {multiple} {unit} $end"
    yield "$scope module capture $end"
    for k, trace in enumerate(traces):
        name = "_".join(trace.channel.split()) or f"column_{k + 1}"
        yield f"$var wire 1 {_code(k)} {name} $end"
    yield "$upscope $end"
    yield "$enddefinitions $end"
    yield from _changes(traces, power)


def _changes(traces: list[LogicTrace], power: int) -> Iterator[str]:
    events = sorted(
        (_count(time_s, power), order, f"{state}{_code(k)}")
        for k, trace in enumerate(traces)
        for order, (time_s, state) in enumerate(_states(trace))
    )
    now: int | None = None
    for time, _, change in events:
        if time != now:
            yield f"#{time}"
            now = time
        yield change
    end = max(_count(span.end_s, power) for trace in traces for span in trace.spans[-1:])
    if end != now:
        yield f"#{end}"


def _states(trace: LogicTrace) -> Iterator[tuple[float, str]]:
    at = 0
    for span in trace.spans:
        yield span.start_s, "1" if span.starts_high else "0"
        while at < trace.times_s.size and trace.times_s[at] <= span.end_s:
            yield float(trace.times_s[at]), "1" if trace.states[at] else "0"
            at += 1
        if span is not trace.spans[-1]:
            yield span.end_s, "x"


def _code(k: int) -> str:
    """Return the identifier code of variable ``k``: printable ASCII 33 to 126."""
    text = ""
    while True:
        text += chr(33 + k % 94)
        k = k // 94 - 1
        if k < 0:
            return text


def _count(time_s: float, power: int) -> int:
    return round(time_s * 10.0**-power) if power <= 0 else round(time_s / 10.0**power)


def _timescale(traces: list[LogicTrace]) -> tuple[str, int, int]:
    """Return the coarsest legal timescale on which all times are whole."""
    times = np.concatenate([np.array(_all_times(trace)) for trace in traces])
    for unit, multiple, power in _SCALES:
        counts = times * 10.0**-power
        if counts.size and np.max(np.abs(counts - np.rint(counts))) < _NEAR:
            return unit, multiple, power
    return _SCALES[-1]


def _all_times(trace: LogicTrace) -> list[float]:
    ends = [t for span in trace.spans for t in (span.start_s, span.end_s)]
    return [*trace.times_s.tolist(), *ends]
