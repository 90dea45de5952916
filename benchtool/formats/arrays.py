"""Captures from NumPy arrays: our own layout, then what other programs save."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import replace
from typing import Any

import numpy as np

from benchtool.errors import MalformedCaptureError
from benchtool.formats.arrayfile import StoredArray, find_arrays
from benchtool.formats.content import Content
from benchtool.formats.foreign import contradiction, foreign_traces, refuse_overruled_time
from benchtool.formats.stored import DerivedSamples
from benchtool.model.arrays import NDArray
from benchtool.model.capture import (
    Capture,
    LogicTrace,
    Origin,
    ReadOptions,
    Samples,
    Scale,
    Span,
    StampedTime,
    StructurePoint,
    TimeSpan,
    Trace,
    UniformTime,
    Waveform,
)
from benchtool.model.quantity import Notice

Stored = Mapping[str, StoredArray]

_OURS = re.compile(r"(?:samples|times)(?:\.(\d+))?")


def read_arrays(content: Content, options: ReadOptions) -> Capture:
    """Read an ``.npz`` or ``.npy`` file.

    Raises:
        AmbiguousStructureError: If nothing gives its time.
        MalformedCaptureError: If it is damaged, pickled, or holds no numbers.
    """
    arrays = find_arrays(content)
    points: list[StructurePoint] = []
    warnings: tuple[Notice, ...] = ()
    traces = _own_traces(arrays, content)
    if traces:
        refuse_overruled_time(options, content)
    else:
        columns, scalars = _columns(arrays, content), _scalars(arrays)
        traces, points, warnings = foreign_traces(columns, scalars, options, content)
    layout = StructurePoint(
        name="arrays",
        value=", ".join(sorted(arrays)),
        evidence="names in the archive",
        sure="stated",
    )
    return Capture(
        origin=Origin(source=content.source, format="npz", sha256=content.sha256),
        traces=traces,
        structure=(layout, *points),
        warnings=(*warnings, *_cut_notices(arrays, content)),
    )


def _columns(arrays: Stored, content: Content) -> dict[str, Samples]:
    """Return the rows of numbers in a file by name.

    Raises:
        MalformedCaptureError: If there is none (``no-values``).
    """
    alone = len([array for array in arrays.values() if array.size > 1]) == 1
    found: dict[str, Samples] = {}
    for name, array in arrays.items():
        table = alone and len(array.shape) == 2
        found |= array.columns("column" if table else name) if array.size > 1 else ()
    numbers = {name: row for name, row in found.items() if _is_number(row.dtype)}
    if numbers:
        return numbers
    shapes = ", ".join(f"{name} {array.shape}" for name, array in list(arrays.items())[:8])
    raise MalformedCaptureError(
        f"{content.source} holds no row of numbers: {shapes or 'it has no array'}",
        hint="Save the samples as a 1-D array of numbers.",
        path=content.source,
        code="no-values",
    )


def _is_number(dtype: np.dtype[Any]) -> bool:
    return dtype.kind in "iufb" and not dtype.shape


def _scalars(arrays: Stored) -> dict[str, NDArray[Any]]:
    return {n: a.load() for n, a in arrays.items() if a.size == 1 and _is_number(a.dtype)}


def _cut_notices(arrays: Stored, content: Content) -> list[Notice]:
    cut = {name: array for name, array in arrays.items() if array.n_promised is not None}
    return [
        Notice(
            code="file-cut",
            text=f"the header of {content.source} promises {array.n_promised} rows of {name}, "
            f"the file holds {array.shape[0]}",
        )
        for name, array in cut.items()
    ]


def _own_traces(arrays: Stored, content: Content) -> tuple[Trace, ...]:
    """Return the traces of our own layout, none where it is another."""
    found = [match for name in arrays if (match := _OURS.fullmatch(name))]
    suffixes = sorted({m[1] for m in found}, key=lambda s: int(s or 0))
    traces = []
    for suffix in suffixes:
        tail = "" if suffix is None else f".{suffix}"
        own = {
            name.removesuffix(tail): value
            for name, value in arrays.items()
            if name.endswith(tail) and (tail or "." not in name)
        }
        try:
            trace = _own_trace(own)
        except (ValueError, TypeError, IndexError) as error:
            raise contradiction(content, str(error)) from error
        if trace is None:
            return ()
        fault = _fault_of(trace)
        if fault:
            raise contradiction(content, fault)
        traces.append(trace)
    return tuple(traces)


def _fault_of(trace: Trace) -> str:
    """Return what is impossible about the pieces or transitions of a stored trace, or nothing."""
    bounds: list[float] = []
    if isinstance(trace, LogicTrace):
        for piece in trace.spans:
            bounds += (piece.start_s, piece.end_s)
        times_s = trace.times_s
        place = np.searchsorted(bounds[::2], times_s, side="right") - 1
        if not np.isfinite(times_s).all() or (np.diff(times_s) < 0).any():
            return "transitions out of order"
        if times_s.size and (place < 0).any():
            return "a transition before the record"
        if (times_s > np.array(bounds[1::2] or [0.0])[place]).any():
            return "a transition outside the record"
        if ((np.diff(place) == 0) & (trace.states[1:] == trace.states[:-1])).any():
            return "a transition that changes nothing"
    else:
        for span in trace.spans:
            bounds += (span.start, span.stop)
        starts_s = [span.start_s for span in trace.spans]
        if not np.isfinite(starts_s).all() or starts_s != sorted(starts_s):
            return "pieces out of order in time"
    return "" if bounds and bounds == sorted(bounds) else "pieces out of order"


def _own_trace(own: Stored) -> Trace | None:
    name = str(own["channel"].load()) if "channel" in own else ""
    if {"times", "states", "spans"} <= set(own):
        return _own_logic(own, name or "column 1")
    if "samples" not in own or not ({"dt", "time"} & set(own)) or len(own["samples"].shape) != 1:
        return None
    return _own_waveform(own, name or "samples")


def _own_number(own: Stored, name: str, default: float) -> float:
    return float(own[name].load()) if name in own else default


def _own_row(own: Stored, name: str) -> Samples:
    """Return a row of our own layout; one of a single number has no length of its own."""
    array = own[name]
    row: Samples = next(iter(replace(array, shape=array.shape or (1,)).columns(name)))[1]
    return row


def _own_logic(own: Stored, name: str) -> LogicTrace:
    return LogicTrace(
        times_s=np.atleast_1d(own["times"].load()).astype(np.float64),
        states=np.atleast_1d(own["states"].load()).astype(bool),
        spans=tuple(
            TimeSpan(start_s=float(a), end_s=float(b), starts_high=bool(c))
            for a, b, c in np.atleast_2d(own["spans"].load())
        ),
        tick_s=_own_number(own, "tick", 0.0),
        channel=name,
        end_known=bool(_own_number(own, "end_known", 1.0)),
    )


def _own_waveform(own: Stored, name: str) -> Waveform:
    samples = _own_row(own, "samples")
    return Waveform(
        samples=samples,
        scale=Scale(
            gain=_own_number(own, "gain", 1.0),
            offset=_own_number(own, "offset", 0.0),
            step_v=_own_number(own, "step", 0.0) if "step" in own else None,
        ),
        time=_own_time(own, samples.size),
        spans=_own_spans(own, samples.size),
        channel=name,
        unit=str(own["unit"].load()) if "unit" in own else "V",
    )


def _own_time(own: Stored, size: int) -> UniformTime | StampedTime:
    if "dt" in own:
        return UniformTime(dt_s=_own_number(own, "dt", 0.0), u_rel=_own_number(own, "u_rel", 0.0))
    stamps = _own_row(own, "time")
    if stamps.size != size:
        raise ValueError(f"{stamps.size} times for {size} samples")
    first = float(next(iter(stamps.blocks(0, 1)))[0])
    after_first = DerivedSamples(base=stamps, derive=lambda block: block.astype(np.float64) - first)
    return StampedTime(stamps=after_first, resolution_s=_own_number(own, "resolution", 0.0))


def _own_spans(own: Stored, size: int) -> tuple[Span, ...]:
    if "spans" not in own:
        return (Span(start=0, stop=size, start_s=0.0),)
    rows = np.atleast_2d(own["spans"].load())
    return tuple(Span(start=int(a), stop=int(b), start_s=float(c)) for a, b, c in rows)
