"""What was recorded: captures, their traces and where they came from."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal, Protocol

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import AnyArray, BoolArray, FloatArray
from benchtool.model.quantity import Notice
from benchtool.model.watching import tell

if TYPE_CHECKING:
    from benchtool.model.window import Window

BLOCK, BLOCK_BYTES = 1 << 18, 1 << 21
"""Samples in a block, small enough for the cache and large enough for numpy, and bytes in one of
narrow samples, which take numpy so little time that more of them fit."""


class Samples(Protocol):
    """A row of samples that can be walked in blocks as often as needed.

    An array, a mapped file and a text file meet it alike; a file is opened and closed inside
    ``blocks``. The size of a capture costs time and not memory.
    """

    @property
    def size(self) -> int:
        """Number of samples."""

    @property
    def dtype(self) -> np.dtype[np.generic]:
        """Type of a sample: an integer for codes, a float for volts."""

    def blocks(self, start: int = 0, stop: int | None = None) -> Iterator[AnyArray]:
        """Yield consecutive 1-D pieces of the samples ``start`` to ``stop``."""


@dataclass(frozen=True, slots=True, eq=False)
class ArraySamples:
    """Samples held in an array, in memory or mapped from a file."""

    array: AnyArray

    def __post_init__(self) -> None:
        if self.array.ndim != 1:
            raise ValueError(f"samples must be 1-D, got {self.array.ndim}-D")

    @property
    def size(self) -> int:
        """Number of samples."""
        return int(self.array.size)

    @property
    def dtype(self) -> np.dtype[np.generic]:
        """Type of a sample."""
        return self.array.dtype

    def blocks(self, start: int = 0, stop: int | None = None) -> Iterator[AnyArray]:
        """Yield consecutive views of the samples ``start`` to ``stop``."""
        end = self.size if stop is None else min(stop, self.size)
        size = self.array.itemsize
        length = max(BLOCK, BLOCK_BYTES // size)
        for first in range(start, end, length):
            yield self.array[first : min(first + length, end)]
            tell("measuring", (min(first + length, end) - start) * size, (end - start) * size)


@frozen_record
class Scale:
    """Volts from codes: ``volts = gain * code + offset``.

    Attributes:
        gain, offset: Volts a code (1.0 where the samples are volts) and volts at code zero.
        step_v: Size of one code in volts, or None where the samples have no fixed step.
    """

    gain: float = 1.0
    offset: float = 0.0
    step_v: float | None = None

    def __post_init__(self) -> None:
        if not (math.isfinite(self.gain) and self.gain != 0 and math.isfinite(self.offset)):
            raise ValueError(f"a scale needs a finite gain other than 0, got {self.gain}")


@frozen_record
class UniformTime:
    """Evenly spaced samples: sample ``i`` lies at ``span.start_s + (i - span.start) * dt_s``.

    Attributes:
        dt_s: Sample interval in seconds, greater than 0.
        u_rel: Relative standard uncertainty of ``dt_s`` from how it was printed, 0 where exact.
    """

    dt_s: float
    u_rel: float = 0.0

    def __post_init__(self) -> None:
        if not (math.isfinite(self.dt_s) and self.dt_s > 0):
            raise ValueError(f"a sample interval must be finite and > 0, got {self.dt_s}")


@frozen_record(eq=False)
class StampedTime:
    """Samples with a time stamp each, in seconds after the first sample.

    Attributes:
        stamps: float64 seconds, one a sample, not decreasing inside a span.
        resolution_s: Step of the printed stamps (last digit), 0 where unknown.
    """

    stamps: Samples
    resolution_s: float = 0.0


@frozen_record
class Span:
    """A gap-free piece of a waveform: samples ``start`` to ``stop`` (exclusive).

    Attributes:
        start, stop: Index of the first sample, and one past the last.
        start_s: Time of the first sample in seconds after the first sample of the trace.
    """

    start: int
    stop: int
    start_s: float

    def __post_init__(self) -> None:
        if not 0 <= self.start < self.stop:
            raise ValueError(f"a span needs 0 <= start < stop, got {self.start}, {self.stop}")


@frozen_record(eq=False)
class Waveform:
    """One channel of samples.

    ``samples`` are codes or volts, ``scale`` makes volts of them. Floating samples may hold NaN
    for what the file did not give; timing treats a run of NaN as a gap.

    Attributes:
        samples: The samples; 1-D.
        scale: Volts from samples.
        time: Even or stamped time.
        spans: Gap-free pieces in order, never overlapping.
        channel: Name as the file gives it, or ``column 2``.
        unit: Unit of the scaled samples, V, or 1 for sampled logic.
    """

    samples: Samples
    time: UniformTime | StampedTime
    spans: tuple[Span, ...]
    channel: str
    scale: Scale = Scale()
    unit: str = "V"

    def __post_init__(self) -> None:
        if not self.spans:
            raise ValueError("a waveform needs at least one span")
        if self.spans[-1].stop > self.samples.size:
            raise ValueError("the last span ends beyond the samples")

    @property
    def is_logic(self) -> bool:
        """Whether the samples are sampled logic states 0 and 1."""
        return self.unit == "1"


@frozen_record
class TimeSpan:
    """A gap-free piece of a logic trace, with the state it begins in."""

    start_s: float
    end_s: float
    starts_high: bool

    def __post_init__(self) -> None:
        if not self.end_s >= self.start_s:
            raise ValueError(f"a time span cannot end before it starts: {self}")


@frozen_record(eq=False)
class LogicTrace:
    """One channel of transitions.

    Attributes:
        times_s: Seconds after the start of the record, shape (n,), not decreasing.
        states: State after each transition, True is high, shape (n,); the transitions of a span
            alternate, beginning with the one that leaves ``starts_high``.
        spans: Gap-free pieces of the record in order.
        tick_s: Resolution of the times in seconds.
        channel: Name as the file gives it.
        end_known: Whether the record's end is stated; otherwise it ends at its last transition.
    """

    times_s: FloatArray
    states: BoolArray
    spans: tuple[TimeSpan, ...]
    tick_s: float
    channel: str
    end_known: bool = True

    def __post_init__(self) -> None:
        if self.times_s.shape != self.states.shape or self.times_s.ndim != 1:
            raise ValueError("times and states must be 1-D and of one length")
        if not self.tick_s >= 0:
            raise ValueError(f"a tick must be >= 0, got {self.tick_s}")


Trace = Waveform | LogicTrace
Role = Literal["output", "capacitor", "supply", "trigger", "other"]
Sureness = Literal["stated", "measured", "assumed"]


@frozen_record
class StructurePoint:
    """One thing found about a file's structure, and what it was found from.

    Attributes:
        name, value: What it is about, and what was found.
        evidence: What it was found from.
        sure: Stated by the file or the user, measured from the rows, or assumed.
    """

    name: str
    value: str
    evidence: str
    sure: Sureness = "measured"


@frozen_record
class Origin:
    """Where a capture came from.

    Attributes:
        source, format: File name as given (``-`` for standard input); text, vcd, npz or wav.
        sha256: Of the file's bytes as stored.
        start_ns: Absolute start in integer nanoseconds since 1970 (UTC), where the file says.
        instrument: What the file says of the instrument, where it does.
    """

    source: str
    format: str
    sha256: str
    start_ns: int | None = None
    instrument: str | None = None


@frozen_record(eq=False)
class Capture:
    """One file or one acquisition: its traces, its structure and what was assumed on reading.

    ``window`` is the part of the record that the traces are, where they are not all of it;
    ``channel`` names the trace to measure where neither the user nor the design names one.
    """

    origin: Origin
    traces: tuple[Trace, ...]
    structure: tuple[StructurePoint, ...] = ()
    warnings: tuple[Notice, ...] = ()
    window: Window | None = None
    channel: str | None = None

    def __post_init__(self) -> None:
        if not self.traces:
            raise ValueError("a capture needs at least one trace")


@frozen_record
class ReadOptions:
    """What the user overrules about a file's structure; None leaves it to detection.

    Attributes:
        format: Name of the reader.
        delimiter: One of ``, ; tab | space none``, or any other one character.
        decimal: ``.`` or ``,``.
        time: Name (or number, from 1) of the column that gives time; ``none`` counts the rows.
        time_unit: s, ms, us, ns, ps or fs: the unit of the time column.
        interval_s: Sample interval in seconds; it wins over what the file says.
        skip: Lines before the header or the data that are passed over.
        channel: Name (or number, from 1) of the trace to measure.
        structure: Name of the kept structure to apply; ``none`` applies none of them.
    """

    format: str | None = None
    delimiter: str | None = None
    decimal: str | None = None
    time: str | None = None
    time_unit: str | None = None
    interval_s: float | None = None
    skip: int | None = None
    channel: str | None = None
    structure: str | None = None
