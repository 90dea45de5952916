"""NumPy archives: our own layout, which keeps a capture whole, and what others save.

Our layout is an ``.npz`` of plain arrays, one set a trace. With a single trace the names stand
as below; with several, each carries the trace's number from 0 after a point (``samples.0``).

=============== ===================================================================
``channel``     name of the trace
``samples``     codes or volts, 1-D
``dt``          sample interval in seconds (even time), or
``time``        time stamps in seconds after the first sample (stamped time)
``u_rel``       relative standard uncertainty of ``dt``; optional, 0
``resolution``  last digit of ``time`` in seconds; optional, 0
``gain``        volts a code; optional, 1
``offset``      volts at code 0; optional, 0
``step``        size of a code in volts; optional
``unit``        ``V``, or ``1`` for sampled logic; optional, ``V``
``spans``       gap-free pieces, shape (m, 3): start, stop, start in seconds; optional
--------------- -------------------------------------------------------------------
``times``       of a logic trace: its transitions in seconds after the start
``states``      state after each, 1 high, 0 low
``spans``       its pieces, shape (m, 3): start and end in seconds, state it begins in
``tick``        resolution of the times in seconds
``end_known``   whether the record's end is stated
=============== ===================================================================

Of others' archives, 1-D arrays of one length are taken as channels; an array named for time, or
a scalar named for an interval or a rate, gives their time. Pickled objects are never loaded.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any, BinaryIO

import numpy as np

from benchtool.formats.claim import Claim, Format
from benchtool.formats.content import Content
from benchtool.formats.sink import opened
from benchtool.model.capture import Capture, LogicTrace, ReadOptions, Trace, UniformTime, Waveform


def sniff(head: bytes, suffix: str) -> Claim:
    """Claim by magic bytes; a zip archive whose first member is no array only by suffix."""
    if head.startswith(b"\x93NUMPY"):
        return Claim.YES
    if head.startswith((b"PK\x03\x04", b"PK\x05\x06")):
        first_name = head[30 : 30 + int.from_bytes(head[26:28], "little")]
        return Claim.YES if suffix == ".npz" or first_name.endswith(b".npy") else Claim.NO
    return Claim.NO


def _read(content: Content, options: ReadOptions) -> Capture:
    from benchtool.formats.arrays import read_arrays
    from benchtool.formats.counted import refuse_counted

    refuse_counted(content)
    return read_arrays(content, options)


def write_npz(capture: Capture, file: BinaryIO | Path) -> None:
    """Write a capture in our own layout; nothing of its traces is lost.

    Args:
        capture: The capture.
        file: Binary file object, or path of the file to write.
    """
    arrays: dict[str, Any] = {}
    for k, trace in enumerate(capture.traces):
        suffix = f".{k}" if len(capture.traces) > 1 else ""
        arrays |= {f"{name}{suffix}": value for name, value in _trace_arrays(trace).items()}
    with opened(file) as stream:
        np.savez_compressed(stream, **arrays)


def _trace_arrays(trace: Trace) -> dict[str, Any]:
    return _waveform_arrays(trace) if isinstance(trace, Waveform) else _logic_arrays(trace)


def _waveform_arrays(trace: Waveform) -> dict[str, Any]:
    arrays: dict[str, Any] = {
        "channel": trace.channel,
        "samples": np.concatenate(list(trace.samples.blocks())),
        "gain": trace.scale.gain,
        "offset": trace.scale.offset,
        "unit": trace.unit,
        "spans": np.array([(s.start, s.stop, s.start_s) for s in trace.spans]),
    }
    if trace.scale.step_v is not None:
        arrays["step"] = trace.scale.step_v
    if isinstance(trace.time, UniformTime):
        return arrays | {"dt": trace.time.dt_s, "u_rel": trace.time.u_rel}
    stamps = np.concatenate(list(trace.time.stamps.blocks()))
    return arrays | {"time": stamps, "resolution": trace.time.resolution_s}


def _logic_arrays(trace: LogicTrace) -> dict[str, Any]:
    return {
        "channel": trace.channel,
        "times": trace.times_s,
        "states": trace.states.astype(np.uint8),
        "spans": np.array([(s.start_s, s.end_s, s.starts_high) for s in trace.spans], float),
        "tick": trace.tick_s,
        "end_known": trace.end_known,
    }


FORMAT = Format(name="npz", suffixes=(".npz", ".npy"), sniff=sniff, read=_read, write=write_npz)
