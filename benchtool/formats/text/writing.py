"""Writing captures as delimited text: samples, or lists of transitions."""

from __future__ import annotations

import math
from collections.abc import Iterator
from decimal import Decimal
from pathlib import Path
from typing import BinaryIO

import numpy as np

from benchtool.errors import UsageError
from benchtool.formats.sink import opened
from benchtool.model.arrays import AnyArray
from benchtool.model.capture import (
    BLOCK,
    Capture,
    LogicTrace,
    Scale,
    StampedTime,
    UniformTime,
    Waveform,
)

_FINE = 1e-6  # of a sample interval: printing time more finely tells nothing


def write_text(capture: Capture, file: BinaryIO | Path) -> None:
    """Write a capture as comma-separated text.

    Waveforms become a column ``time_s`` and one column a channel, its unit in brackets; logic
    traces a list of transitions, ``x`` where a state is unknown and the last state repeated
    where the record's end is known.

    Args:
        capture: Waveforms with a common time, or logic traces.
        file: Binary file object, or path of the file to write.

    Raises:
        UsageError: If the traces have no common time.
    """
    waveforms = [trace for trace in capture.traces if isinstance(trace, Waveform)]
    logic = [trace for trace in capture.traces if isinstance(trace, LogicTrace)]
    if waveforms and logic:
        raise _no_common_time()
    lines = _sample_blocks(waveforms) if waveforms else _transition_blocks(logic)
    with opened(file) as stream:
        for block in lines:
            stream.write(block.encode("utf-8"))


def _no_common_time() -> UsageError:
    return UsageError(
        "traces without a common time do not fit into one table",
        hint="Write an .npz file, or one trace at a time.",
    )


def _quoted(name: str) -> str:
    return '"' + name.replace('"', '""') + '"' if any(c in name for c in ',"\n#') else name


def _sample_blocks(traces: list[Waveform]) -> Iterator[str]:
    first = traces[0]
    if any(t.time != first.time or t.spans != first.spans for t in traces[1:]):
        raise _no_common_time()
    heads = [t.channel if t.unit == "1" else f"{t.channel} ({t.unit})" for t in traces]
    yield ",".join(["time_s", *map(_quoted, heads)]) + "\n"
    for start in range(0, first.spans[-1].stop, BLOCK):
        stop = min(start + BLOCK, first.spans[-1].stop)
        columns = [_times(first, start, stop), *(_values(t, start, stop) for t in traces)]
        yield "\n".join(map(",".join, zip(*columns, strict=True))) + "\n"


def _piece(samples: Iterator[AnyArray]) -> AnyArray:
    blocks = list(samples)
    return np.concatenate(blocks) if len(blocks) > 1 else blocks[0]


def _values(trace: Waveform, start: int, stop: int) -> list[str]:
    values = _piece(trace.samples.blocks(start, stop))
    if trace.unit == "1" and values.dtype.kind in "iub":
        return [str(int(value)) for value in values]
    if trace.scale.gain == 1.0 and trace.scale.offset == 0.0 and values.dtype.kind != "f":
        return [str(int(value)) for value in values]
    return [_number(value) for value in _volts(values, trace.scale)]


def _volts(values: AnyArray, scale: Scale) -> list[float]:
    volts = values.astype(np.float64)
    if scale.gain == 1.0 and scale.offset == 0.0:
        return [float(value) for value in volts]
    return [float(f"{value:.12g}") for value in volts * scale.gain + scale.offset]


def _number(value: float) -> str:
    return "" if math.isnan(value) else repr(value)


def _times(trace: Waveform, start: int, stop: int) -> list[str]:
    """Return the printed times of samples ``start`` to ``stop``."""
    if isinstance(trace.time, StampedTime):
        stamps = _piece(trace.time.stamps.blocks(start, stop))
        return [repr(float(stamp)) for stamp in stamps]
    texts: list[str] = []
    for span in trace.spans:
        first, last = max(start, span.start), min(stop, span.stop)
        if first < last:
            texts += _grid(trace.time, span.start_s, first - span.start, last - span.start)
    return texts


def _grid(time: UniformTime, origin_s: float, first: int, last: int) -> list[str]:
    """Print an even grid exactly: whole counts of a power of ten, never rounded sums."""
    step = Decimal(repr(time.dt_s))
    finest = -int(np.floor(np.log10(time.dt_s * _FINE)))
    places = max(0, min(-int(step.as_tuple().exponent), finest))
    quantum = Decimal(1).scaleb(-places)
    origin = Decimal(repr(origin_s)).quantize(quantum)
    return [f"{(origin + i * step).quantize(quantum):f}" for i in range(first, last)]


def _transition_blocks(traces: list[LogicTrace]) -> Iterator[str]:
    """Print the states of all channels at each time at which one of them changes."""
    yield ",".join(["time_s", *(_quoted(t.channel) for t in traces)]) + "\n"
    events = sorted(event for k, trace in enumerate(traces) for event in _events(k, trace))
    places = _places(traces)
    states = ["x"] * len(traces)
    lines: list[str] = []
    for i, (time_s, k, state) in enumerate(events):
        states[k] = state
        if i + 1 == len(events) or events[i + 1][0] != time_s:
            lines.append(f"{time_s:.{places}f}," + ",".join(states))
    yield "\n".join(lines) + "\n"


def _places(traces: list[LogicTrace]) -> int:
    """Return the decimals that print every time to well below its tick."""
    ticks = [trace.tick_s for trace in traces if trace.tick_s > 0]
    if not ticks:
        return 12
    exponents = [-int(Decimal(repr(t)).normalize().as_tuple().exponent) for t in ticks]
    return max(0, min(15, max(exponents)))


def _events(k: int, trace: LogicTrace) -> Iterator[tuple[float, int, str]]:
    """Yield time, channel and state of one trace, unknown between its spans."""
    at = 0
    for span in trace.spans:
        yield span.start_s, k, _word(high=span.starts_high)
        high = span.starts_high
        while at < trace.times_s.size and trace.times_s[at] <= span.end_s:
            high = bool(trace.states[at])
            yield float(trace.times_s[at]), k, _word(high=high)
            at += 1
        if span is not trace.spans[-1]:
            yield span.end_s, k, "x"
        elif trace.end_known:
            yield span.end_s, k, _word(high=high)


def _word(*, high: bool) -> str:
    return "1" if high else "0"
