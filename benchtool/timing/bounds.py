"""What is still known where no interval is complete, and refusals that say what is needed."""

from __future__ import annotations

from typing import Literal

from benchtool.errors import MeasurementError
from benchtool.model.arrays import middle
from benchtool.model.quantity import Bound
from benchtool.model.timing import Edges, Intervals, Levels
from benchtool.units import format_value

LEAST_SAMPLES = 4.0
"""Samples a period below which a record is refused."""


def bound_duration(intervals: Intervals, kind: Literal["high", "low"]) -> Bound | None:
    """Return the longest time for which the state was seen, as a lower bound in seconds."""
    longest = _longest_cut(intervals, kind)
    return Bound(unit="s", at_least=longest) if longest > 0 else None


def bound_period(intervals: Intervals) -> Bound | None:
    """Return a lower bound of the period in seconds: the longest high plus the longest low."""
    total = sum(_longest(intervals, kind) for kind in ("high", "low"))
    return Bound(unit="s", at_least=total) if total > 0 else None


def bound_frequency(intervals: Intervals) -> Bound | None:
    """Return an upper bound of the frequency in hertz, from the bound of the period."""
    period = bound_period(intervals)
    if period is None or period.at_least is None:
        return None
    return Bound(unit="Hz", at_most=1 / period.at_least)


def _longest(intervals: Intervals, kind: str) -> float:
    """Return the median of the complete intervals of a kind, or the longest cut one."""
    whole = intervals.high_s if kind == "high" else intervals.low_s
    return middle(whole) if whole.size else _longest_cut(intervals, kind)


def _longest_cut(intervals: Intervals, kind: str) -> float:
    return max((cut.at_least_s for cut in intervals.cut if cut.kind == kind), default=0.0)


def require_states(levels: Levels) -> None:
    """Refuse a trace without two states.

    Raises:
        MeasurementError: With code ``flat-trace`` or ``noise-only``.
    """
    if levels.kind == "flat":
        raise MeasurementError(
            f"the trace is flat: it stays at {levels.mid_v:.4g} V with "
            f"{levels.noise_v:.2g} V of noise",
            hint="Check probe, supply and channel; `benchtool look FILE` lists the traces.",
            code="flat-trace",
        )
    if levels.kind == "noise":
        raise MeasurementError(
            f"the trace has no two states: it scatters by {levels.noise_v:.3g} V around "
            f"{levels.mid_v:.4g} V",
            hint="Connect the probe to the output, or choose another trace with --channel.",
            code="noise-only",
        )


def require_intervals(intervals: Intervals, edges: Edges) -> None:
    """Refuse a record from which no interval can be measured.

    Raises:
        MeasurementError: With code ``no-interval`` where nothing is complete, or
            ``under-sampled`` where a period holds fewer than about four samples.
    """
    if not (intervals.high_s.size or intervals.low_s.size):
        raise _no_interval(intervals, edges)
    if intervals.period_s.size and edges.step_s > 0:
        per_period = middle(intervals.period_s) / edges.step_s
        if per_period < LEAST_SAMPLES:
            raise _under_sampled(per_period, edges)


def _no_interval(intervals: Intervals, edges: Edges) -> MeasurementError:
    span_s = sum(run.end_s - run.start_s for run in edges.runs)
    bound = bound_period(intervals)
    at_least = bound.at_least if bound and bound.at_least else span_s
    return MeasurementError(
        f"no interval is complete: edges seen in {format_value(span_s, 's')}: "
        f"{edges.times_s.size}; a period lasts at least {format_value(at_least, 's')}",
        hint=f"Record at least {format_value(3 * at_least, 's', 3)} without a gap, better ten "
        "periods.",
        code="no-interval",
    )


def _under_sampled(per_period: float, edges: Edges) -> MeasurementError:
    rate_hz = 10 / (per_period * edges.step_s)
    return MeasurementError(
        f"a period holds only {per_period:.2g} samples: edges between them may be missed",
        hint=f"Sample at {format_value(rate_hz, 'Hz', 3)} or faster, ten samples a period or more.",
        code="under-sampled",
    )
