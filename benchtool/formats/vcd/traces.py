"""From the changes of variables to traces."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from benchtool.formats.grid import greatest_common_spacing
from benchtool.formats.logic import UNKNOWN, States, logic_trace
from benchtool.formats.vcd.changes import Body, NumberChanges
from benchtool.formats.vcd.header import Variable
from benchtool.model.arrays import FloatArray, IntArray, distinct
from benchtool.model.capture import ArraySamples, LogicTrace, Span, StampedTime, Trace, Waveform

_FEW = 4096


def bit_traces(variable: Variable, name: str, body: Body, per_second: float) -> Iterator[Trace]:
    """Yield a logic trace for each bit of a variable that was ever known; its changes are let go.

    Args:
        variable: A scalar, or a vector.
        name: Name of its trace.
        body: All changes.
        per_second: Counts a second.
    """
    titles = [f"{name}[{i}]" for i in variable.bits] or [name]
    for title, changes in zip(titles, body.bits.pop(variable.code), strict=True):
        pieces = changes.hand_over()
        if any(states.max() >= 0 for _, states in pieces):
            yield _logic(pieces, title, body.time, per_second)


def number_traces(
    changes: NumberChanges, name: str, body: Body, per_second: float
) -> Iterator[Trace]:
    """Yield the trace of a number: logic where it has two values, else held from change to change.

    Args:
        changes: Its changes.
        name: Name of its trace.
        body: All changes.
        per_second: Counts a second.
    """
    pieces = changes.hand_over()[::-1]
    times = np.concatenate([np.empty(0, np.int64), *(piece for piece, _ in pieces)])
    values = np.concatenate([np.empty(0), *(piece for _, piece in pieces)])
    known = np.isfinite(values)
    levels = distinct(values[known])
    if levels.size == 2:
        states = np.where(known, values == levels[1], UNKNOWN).astype(np.int8)
        yield _logic([(times, states)], name, body.time, per_second)
    elif levels.size > 2:
        stamps, held = _staircase(times, values, body.time)
        yield Waveform(
            samples=ArraySamples(held),
            time=StampedTime(stamps=ArraySamples(stamps / per_second), resolution_s=1 / per_second),
            spans=(Span(start=0, stop=held.size, start_s=0.0),),
            channel=name,
        )


def _logic(
    pieces: list[tuple[IntArray, States]], title: str, end: int, per_second: float
) -> LogicTrace:
    """Make a trace, letting its pieces go one by one; the first of them is the last in the list."""
    n_changes = sum(times.size for times, _ in pieces)
    times_s, states = np.empty(n_changes), np.empty(n_changes, np.int8)
    tick, at, before = _Tick(), 0, UNKNOWN
    while pieces:
        times, piece = pieces.pop()
        stop = at + times.size
        np.divide(times, per_second, out=times_s[at:stop])
        states[at:stop] = piece
        tick.add(times, piece, before)
        before, at = int(piece[-1]), stop
    return logic_trace(
        times_s,
        states,
        end_s=end / per_second,
        tick_s=tick.spacing() / per_second,
        channel=title,
        end_stated=False,
    )


class _Tick:
    """Finds the spacing that the transitions of a trace share, which is not the timescale."""

    def __init__(self) -> None:
        self._spacing = self._n = 0
        self._few: list[IntArray] = []

    def add(self, times: IntArray, states: States, before: int) -> None:
        """Take the changes of a piece that follow a state."""
        changed = np.append(before != UNKNOWN and states[0] != before, states[1:] != states[:-1])
        moved = times[changed & (states != UNKNOWN)]
        self._n += moved.size
        if self._n <= _FEW:
            self._few.append(moved)
        if self._spacing != 1 and moved.size:
            self._spacing = int(np.gcd.reduce(moved, initial=self._spacing))

    def spacing(self) -> int:
        """Return the spacing in counts."""
        if self._n <= _FEW:
            return greatest_common_spacing(np.concatenate([np.empty(0, np.int64), *self._few]))
        return self._spacing or 1


def _staircase(times: IntArray, values: FloatArray, end: int) -> tuple[FloatArray, FloatArray]:
    """Let each value hold until one count before the next, and the last to the end."""
    last = np.append(np.diff(times) > 0, True)
    times, values = times[last], values[last]
    if times[-1] < end:
        times, values = np.append(times, end), np.append(values, values[-1])
    holds = np.flatnonzero(np.diff(times) > 1)
    stamps = np.insert(times, holds + 1, times[holds + 1] - 1)
    return stamps.astype(np.float64), np.insert(values, holds + 1, values[holds])
