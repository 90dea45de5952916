"""Captures from NumPy arrays: our own layout, then what other programs save."""

from __future__ import annotations

import re
from typing import Any

import numpy as np

from benchtool.errors import MalformedCaptureError
from benchtool.formats.content import Content
from benchtool.formats.foreign import Arrays, contradiction, foreign_traces, frozen
from benchtool.model.arrays import NDArray
from benchtool.model.capture import (
    ArraySamples,
    Capture,
    LogicTrace,
    Origin,
    ReadOptions,
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

_OURS = re.compile(r"(?:samples|times)(?:\.(\d+))?")


def read_arrays(content: Content, options: ReadOptions) -> Capture:
    """Read an ``.npz`` or ``.npy`` file.

    Raises:
        AmbiguousStructureError: If nothing gives its time.
        MalformedCaptureError: If it is damaged, pickled, or holds no numbers.
    """
    arrays = _load(content)
    points: list[StructurePoint] = []
    warnings: tuple[Notice, ...] = ()
    traces = _own_traces(arrays, content)
    if not traces:
        traces, points, warnings = foreign_traces(arrays, options, content)
    layout = StructurePoint(
        name="arrays", value=", ".join(sorted(arrays)), evidence="names in the archive"
    )
    return Capture(
        origin=Origin(source=content.source, format="npz", sha256=content.sha256),
        traces=traces,
        structure=(layout, *points),
        warnings=warnings,
    )


def _load(content: Content) -> dict[str, NDArray[Any]]:
    try:
        with content.open() as file:
            loaded = np.load(file, allow_pickle=False)
            if isinstance(loaded, np.ndarray):
                return _columns_of(loaded)
            return {name: loaded[name] for name in loaded.files}
    except Exception as error:  # of a damaged header numpy raises whatever its parser met
        raise _unreadable(content, error) from error


def _unreadable(content: Content, error: Exception) -> MalformedCaptureError:
    pickled = "pickle" in str(error).lower()
    reason = "holds pickled objects, which are never loaded" if pickled else "is cut or damaged"
    return MalformedCaptureError(
        f"{content.source} {reason}",
        hint="Save plain numeric arrays with numpy.savez(time=…, samples=…).",
        path=content.source,
        code="pickled" if pickled else None,
    )


def _columns_of(array: NDArray[Any]) -> dict[str, NDArray[Any]]:
    """Return the columns of a bare array by name."""
    if array.dtype.names:
        return {name: array[name] for name in array.dtype.names}
    if array.ndim == 2:
        wide = array.shape[0] < array.shape[1] and array.shape[0] <= 64
        rows = array if wide else array.T
        return {f"column {k + 1}": row for k, row in enumerate(rows)}
    return {"column 1": np.atleast_1d(array)}


def _own_traces(arrays: Arrays, content: Content) -> tuple[Trace, ...]:
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
        traces.append(trace)
    return tuple(traces)


def _own_trace(own: Arrays) -> Trace | None:
    name = str(own["channel"]) if "channel" in own else ""
    if {"times", "states", "spans"} <= set(own):
        return _own_logic(own, name or "column 1")
    if "samples" not in own or not ({"dt", "time"} & set(own)) or own["samples"].ndim != 1:
        return None
    return _own_waveform(own, name or "samples")


def _own_logic(own: Arrays, name: str) -> LogicTrace:
    return LogicTrace(
        times_s=frozen(own["times"].astype(np.float64)),
        states=frozen(own["states"].astype(bool)),
        spans=tuple(
            TimeSpan(start_s=float(a), end_s=float(b), starts_high=bool(c))
            for a, b, c in own["spans"]
        ),
        tick_s=float(own.get("tick", np.float64(0))),
        channel=name,
        end_known=bool(own.get("end_known", np.bool_(True))),
    )


def _own_waveform(own: Arrays, name: str) -> Waveform:
    samples = own["samples"]
    step = float(own["step"]) if "step" in own else None
    time: UniformTime | StampedTime
    if "dt" in own:
        time = UniformTime(dt_s=float(own["dt"]), u_rel=float(own.get("u_rel", np.float64(0))))
    else:
        stamps = own["time"].astype(np.float64)
        if stamps.shape != samples.shape:
            raise ValueError(f"{stamps.size} times for {samples.size} samples")
        time = StampedTime(
            stamps=ArraySamples(frozen(stamps - stamps[0])),
            resolution_s=float(own.get("resolution", np.float64(0))),
        )
    return Waveform(
        samples=ArraySamples(frozen(samples)),
        scale=Scale(
            gain=float(own.get("gain", np.float64(1))),
            offset=float(own.get("offset", np.float64(0))),
            step_v=step,
        ),
        time=time,
        spans=_own_spans(own, samples.size),
        channel=name,
        unit=str(own.get("unit", np.str_("V"))),
    )


def _own_spans(own: Arrays, size: int) -> tuple[Span, ...]:
    if "spans" not in own:
        return (Span(start=0, stop=size, start_s=0.0),)
    return tuple(Span(start=int(a), stop=int(b), start_s=float(c)) for a, b, c in own["spans"])
