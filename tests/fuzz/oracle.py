"""What must hold for every file whatever: a result or one of our errors, and one reading of it.

``attempt`` raises whatever breaks that. It needs nothing but benchtool, so that tests and the
fuzzing run hold files against the same rules.
"""

from __future__ import annotations

import json
import math
from pathlib import Path

import numpy as np

from benchtool import pipeline
from benchtool.errors import AmbiguousStructureError, BenchtoolError
from benchtool.formats import read_capture
from benchtool.formats.text import walking
from benchtool.model.capture import Capture, LogicTrace, ReadOptions, StampedTime, Trace
from benchtool.model.options import MeasureOptions
from benchtool.model.result import Analysis
from benchtool.report.document import analysis_document, error_document

SMALL_BLOCK = 700
"""Bytes: so small that even a small file is walked in several blocks."""

ANSWERS = ReadOptions(interval_s=1e-5, time_unit="us", decimal=".", delimiter=",")
"""What a user may answer to every question that a file raises."""


class RuleBrokenError(AssertionError):
    """A file was read in two ways, or into something impossible."""


def attempt(path: Path) -> str:
    """Read and measure a file in every way; return the code of its refusal, or "read".

    Raises:
        RuleBrokenError: If two ways disagree, or a trace is impossible.
        Exception: Whatever else the program raised that is no error of ours.
    """
    outcome = _attempt_with(path, ReadOptions())
    if outcome.startswith("?"):
        _attempt_with(path, ANSWERS)
    return outcome.removeprefix("?")


def _attempt_with(path: Path, options: ReadOptions) -> str:
    whole = _outcome(path, options)
    held, walked = (_outcome(path, options, block=SMALL_BLOCK, limit=n) for n in (1 << 20, 0))
    if isinstance(held, BenchtoolError) or isinstance(walked, BenchtoolError):
        _demand(_said(held) == _said(walked), f"{_said(held)} in memory, {_said(walked)} on disk")
    else:
        compare(held, walked)
    if isinstance(whole, BenchtoolError):
        asked = isinstance(whole, AmbiguousStructureError)
        return f"?{_said(whole)}" if asked else _said(whole)
    if isinstance(walked, Capture) and not whole.warnings:
        compare(whole, walked, scales=False)  # the first block tells the step of the values
    for trace in whole.traces:
        check_trace(trace)
    _measure(whole, options)
    return "read"


def _outcome(
    path: Path, options: ReadOptions, *, block: int | None = None, limit: int = 1 << 20
) -> Capture | BenchtoolError:
    kept = walking.BLOCK_BYTES
    try:
        walking.BLOCK_BYTES = block or kept
        return read_capture(path, options, in_memory_bytes=limit)
    except BenchtoolError as error:
        check_error(error)
        return error
    finally:
        walking.BLOCK_BYTES = kept


def _said(outcome: Capture | BenchtoolError) -> str:
    return outcome.code if isinstance(outcome, BenchtoolError) else "read"


def check_error(error: BenchtoolError) -> None:
    """Hold an error against what every error must be: a sentence, a next step, a document."""
    if "\n" in error.message or not error.hint or not error.message:
        raise RuleBrokenError(f"a message of several lines, or none: {error.message!r}")
    json.dumps(error_document(error, command="measure"), allow_nan=False)


def _measure(capture: Capture, options: ReadOptions) -> None:
    chosen = MeasureOptions(read=options)
    for verb in (_looked, _timing):
        try:
            analysis = verb(capture, chosen)
        except BenchtoolError as error:
            check_error(error)
            continue
        document = analysis_document(analysis, version="0", made_at="2031-03-02T03:12:00Z")
        json.dumps(document, allow_nan=False)


def _looked(capture: Capture, chosen: MeasureOptions) -> Analysis:
    return pipeline.look([capture], options=chosen)


def _timing(capture: Capture, chosen: MeasureOptions) -> Analysis:
    return pipeline.measure(capture, options=chosen)


def check_trace(trace: Trace) -> None:
    """Hold a trace against what every trace must be: times in order, spans within its samples."""
    if isinstance(trace, LogicTrace):
        _demand(bool(np.all(np.isfinite(trace.times_s))), "a transition without a time")
        _demand(bool(np.all(np.diff(trace.times_s) >= 0)), "transitions out of order")
        ends = [t for s in trace.spans for t in (s.start_s, s.end_s)]
        _demand(ends == sorted(ends), "pieces out of order")
        return
    starts = [s.start_s for s in trace.spans]
    _demand(all(map(math.isfinite, starts)), "a piece without a time")
    _demand(starts == sorted(starts), "pieces out of order")
    limits = [i for s in trace.spans for i in (s.start, s.stop)]
    _demand(limits == sorted(limits), "pieces that overlap")
    if isinstance(trace.time, StampedTime):
        stamps = _joined(trace.time.stamps)
        _demand(stamps.size == trace.samples.size, "not one stamp a sample")
        _demand(bool(np.all(np.isfinite(stamps))), "a sample without a time")
        for span in trace.spans:
            ordered = np.all(np.diff(stamps[span.start : span.stop]) >= 0)
            _demand(bool(ordered), "stamps out of order within a piece")


def _demand(holds: bool, otherwise: str) -> None:
    if not holds:
        raise RuleBrokenError(otherwise)


def compare(one: Capture, other: Capture, *, scales: bool = True) -> None:
    """Demand the same traces and notices, to the last bit.

    Args:
        one: The capture read in one way.
        other: The same file read in another.
        scales: Whether the steps of the values must agree too.
    """
    _demand(len(one.traces) == len(other.traces), "another number of traces")
    _demand(one.warnings == other.warnings, "other notices")
    for a, b in zip(one.traces, other.traces, strict=True):
        facts = _facts(a, scales=scales), _facts(b, scales=scales)
        _demand(facts[0] == facts[1], f"another structure, {facts[0]} and {facts[1]}")
        for x, y in zip(_arrays(a), _arrays(b), strict=True):
            _demand(np.array_equal(x, y, equal_nan=True), f"other samples, of {a.channel}")


def _facts(trace: Trace, *, scales: bool) -> tuple[object, ...]:
    if isinstance(trace, LogicTrace):
        return trace.channel, trace.spans, trace.tick_s, trace.end_known
    time = trace.time
    clock = ("stamped", time.resolution_s) if isinstance(time, StampedTime) else time
    scale = trace.scale if scales else None
    return trace.channel, trace.spans, scale, trace.unit, clock, trace.samples.size


def _arrays(trace: Trace) -> list[np.ndarray]:
    if isinstance(trace, LogicTrace):
        return [trace.times_s, trace.states]
    arrays = [_joined(trace.samples)]
    if isinstance(trace.time, StampedTime):
        arrays.append(_joined(trace.time.stamps))
    return arrays


def _joined(samples: object) -> np.ndarray:
    blocks = list(samples.blocks())  # type: ignore[attr-defined]
    joined = np.concatenate(blocks) if blocks else np.empty(0)
    return joined.astype(np.float64)
