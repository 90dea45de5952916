"""What timing finds in a trace: levels, edges, intervals and the figures made of them."""

from __future__ import annotations

from dataclasses import replace
from typing import Literal

from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, FloatArray
from benchtool.model.quantity import Bound, Measured, Notice, Quantity

LevelKind = Literal["two-state", "flat", "noise", "node"]


@frozen_record
class Levels:
    """State levels of a trace and the reference levels between them (IEEE 181).

    Attributes:
        kind: ``two-state`` for a wave; ``flat`` and ``noise`` for a trace without one; ``node``
            for a capacitor node, whose levels are its turning points.
        low_v: Low state level in volts (the mean, for a flat trace).
        high_v: High state level in volts (the mean, for a flat trace).
        u_low_v: Standard uncertainty of ``low_v``.
        u_high_v: Standard uncertainty of ``high_v``.
        noise_v: Standard deviation of the noise around the levels.
        lower_v: Lower reference level, where a falling edge is complete.
        mid_v: Mid reference level, where an edge's time is taken.
        upper_v: Upper reference level, where a rising edge is complete.
        step_v: Code step of the samples, 0 where they have none.
        clipped: Whether a state sits at the end of the code range.
        warnings: What was seen on the way.
    """

    kind: LevelKind
    low_v: float
    high_v: float
    u_low_v: float
    u_high_v: float
    noise_v: float
    lower_v: float
    mid_v: float
    upper_v: float
    step_v: float = 0.0
    clipped: bool = False
    warnings: tuple[Notice, ...] = ()


@frozen_record
class EdgeRun:
    """A gap-free run of edges: edges ``first`` to ``stop`` (exclusive) of the record.

    Attributes:
        first: Index of its first edge.
        stop: One past its last edge; equal to ``first`` where the run has none.
        start_s: When the run begins.
        end_s: When the run ends.
        starts_high: State in which the run begins.
    """

    first: int
    stop: int
    start_s: float
    end_s: float
    starts_high: bool


@frozen_record(eq=False)
class Edges:
    """Crossings of the mid level. Waveform and logic meet here; nobody after can tell them apart.

    Attributes:
        times_s: Seconds after the start of the record, shape (n,).
        rising: True where the edge rises, shape (n,); alternates inside a run.
        u_s: Standard uncertainty of each time from noise over slew, shape (n,).
        runs: Gap-free runs, in order.
        step_s: Sample interval or tick in seconds: the grid on which times lie; 0 where none.
        resolved: Whether interpolation places edges between the grid's points.
        level_u_s: Standard uncertainty of t_high and t_low from the error of the reference level
            and the code step over the slew; common to all widths, cancels in the period.
        stretch_u_rel: Relative standard uncertainty of all times from few printed digits.
        end_known: Whether the record's end is stated.
        grid_s: What is left of the grid in resolved times, as the grid step that would give the
            same error; 0 where edges hold enough samples.
        n_runts: Pulses that cross the mid level and return without reaching the other state.
        warnings: What was seen on the way.
    """

    times_s: FloatArray
    rising: BoolArray
    u_s: FloatArray
    runs: tuple[EdgeRun, ...]
    step_s: float
    resolved: bool
    level_u_s: float = 0.0
    stretch_u_rel: float = 0.0
    end_known: bool = True
    grid_s: float = 0.0
    n_runts: int = 0
    warnings: tuple[Notice, ...] = ()

    def __post_init__(self) -> None:
        if not self.times_s.shape == self.rising.shape == self.u_s.shape:
            raise ValueError("times, directions and uncertainties must be of one length")

    def inverted(self) -> Edges:
        """Return the edges with high and low exchanged."""
        runs = tuple(replace(run, starts_high=not run.starts_high) for run in self.runs)
        return replace(self, rising=~self.rising, runs=runs)


@frozen_record
class CutInterval:
    """An interval that an end of the record or a gap cuts: known to be at least so long."""

    kind: Literal["high", "low"]
    at_least_s: float
    where: Literal["start", "end", "both"]


@frozen_record
class Dropped:
    """How many intervals were left out of the statistics, and why."""

    reason: str
    count: int


@frozen_record(eq=False)
class Intervals:
    """Complete intervals, those cut by the ends, and those left out.

    Attributes:
        high_s, low_s, period_s: Durations of the complete intervals in seconds, shape (n,) each.
        high_starts_s, low_starts_s, period_starts_s: When each begins, seconds.
        cycle_high_s, cycle_low_s: High and low time of the same whole cycles, for the duty.
        chains: For the periods: index ranges (start, stop) of unbroken successions, so that
            neighbours may be compared.
        active: State that begins a cycle.
        first_high_s: The long first interval after power-up, where one was seen.
        other_period_s: Periods in the other edge direction, for comparison.
        cut: Intervals cut by an end or a gap.
        dropped: What was left out, with reasons.
        warnings: What was seen on the way.
    """

    high_s: FloatArray
    low_s: FloatArray
    period_s: FloatArray
    high_starts_s: FloatArray
    low_starts_s: FloatArray
    period_starts_s: FloatArray
    cycle_high_s: FloatArray
    cycle_low_s: FloatArray
    chains: tuple[tuple[int, int], ...]
    active: Literal["high", "low"]
    other_period_s: FloatArray
    first_high_s: float | None = None
    cut: tuple[CutInterval, ...] = ()
    dropped: tuple[Dropped, ...] = ()
    warnings: tuple[Notice, ...] = ()

    @property
    def standstill(self) -> CutInterval | None:
        """The interval that the record's end cuts, where it far outlasts all whole ones alike.

        Three times the longest of them: the first high after power-up is 1.6 times as long.
        """
        for cut in self.cut:
            whole_s = self.high_s if cut.kind == "high" else self.low_s
            if cut.where == "end" and whole_s.size and cut.at_least_s > 3 * whole_s.max():
                return cut
        return None


@frozen_record
class Timing:
    """The timing figures; None where the trace holds nothing about one."""

    t_high: Quantity | None = None
    t_low: Quantity | None = None
    period: Quantity | None = None
    frequency: Quantity | None = None
    duty: Quantity | None = None
    first_high: Measured | None = None
    delay: Quantity | None = None
    drift: Measured | None = None
    warnings: tuple[Notice, ...] = ()


@frozen_record
class Jitter:
    """Scatter of the periods. ``grid_share`` is the sd that the grid alone would give."""

    period_sd: Quantity | None = None
    period_pp: Measured | None = None
    cycle_rms: Quantity | None = None
    cycle_peak: Measured | None = None
    grid_share: Measured | Bound | None = None
    lag1: float | None = None
    warnings: tuple[Notice, ...] = ()


@frozen_record
class StabilityPoint:
    """Overlapping Allan deviation at one averaging time, with its 95 % interval."""

    tau_s: float
    adev: float
    lower: float
    upper: float
    n: int
