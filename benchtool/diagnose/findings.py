"""Findings: what is seen in a trace that no figure tells, with the faults that can cause it."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Literal

from benchtool.model.result import Finding
from benchtool.model.timing import Edges, Intervals, Levels, Timing
from benchtool.uncertainty import expanded
from benchtool.units import format_measured, format_value

if TYPE_CHECKING:
    from benchtool.model.design import TopologyName

STUCK_HIGH_SHARE = 0.6
STUCK_LOW_SHARE = 0.3

_MAY_BE: dict[str, tuple[str, ...]] = {
    "stuck-high": ("C-short", "C-leaky", "RA-open", "RB-open", "R-open", "control-high"),
    "stuck-low": ("node-leak-to-supply", "discharge-weak", "lower-threshold", "control-low"),
    "drifting": ("C-leaky", "C-low", "control-bypass-missing"),
    "missed-edge": ("supply-ripple", "control-bypass-missing", "lower-threshold"),
    "false-trigger": ("supply-ripple", "control-bypass-missing"),
}
_RESTING = ("one-shot", "power-on")
"""Topologies whose output may rest; where none is known, it may."""

_MISSED = "missing pulse"
_FALSE = ("glitch", "runt", "bounce")


def flat_state(
    levels: Levels | None, edges: Edges, supply_v: float | None
) -> Literal["high", "low"] | None:
    """Return the state of a trace without edges, None where it lies between or is not known.

    Args:
        levels: Levels of the waveform, None for a logic trace.
        edges: Its edges, none of them.
        supply_v: Supply in volts, None where not known.
    """
    if levels is None:
        return "high" if edges.runs and edges.runs[0].starts_high else "low"
    if supply_v is None or levels.kind != "flat":
        return None
    share = levels.low_v / supply_v
    if share > STUCK_HIGH_SHARE:
        return "high"
    return "low" if share < STUCK_LOW_SHARE else None


def flat_length(edges: Edges) -> float | None:
    """Return the length in seconds of a record without an edge, None where there is one."""
    if edges.times_s.size or not edges.runs:
        return None
    return max(run.end_s - run.start_s for run in edges.runs)


def find_findings(
    levels: Levels | None,
    edges: Edges,
    intervals: Intervals,
    timing: Timing,
    *,
    supply_v: float | None = None,
    topology: TopologyName | None = None,
) -> tuple[Finding, ...]:
    """Return what is seen in a trace.

    Args:
        levels: Levels of the waveform, None for a logic trace.
        edges: Its edges.
        intervals: Its intervals.
        timing: The figures made of them.
        supply_v: Supply of the board in volts, where known.
        topology: The circuit, where known: faults that it cannot have are left out.
    """
    candidates = (
        _stuck(levels, edges, supply_v),
        _stopped(intervals) if topology and topology not in _RESTING else None,
        _drifting(timing),
        _disturbed(intervals, "missed-edge", (_MISSED,)),
        _disturbed(intervals, "false-trigger", _FALSE),
    )
    return tuple(
        replace(item, may_be=_possible(item.may_be, topology)) for item in candidates if item
    )


def _possible(faults: tuple[str, ...], topology: TopologyName | None) -> tuple[str, ...]:
    if topology is None:
        return faults
    from benchtool.circuits import FAULTS  # measuring without a design needs no circuit model

    elsewhere = {name for name, fault in FAULTS.items() if topology not in fault.topologies}
    return tuple(name for name in faults if name not in elsewhere)


def _finding(code: str, text: str) -> Finding:
    return Finding(code=code, text=text, may_be=_MAY_BE[code])


def _stuck(levels: Levels | None, edges: Edges, supply_v: float | None) -> Finding | None:
    length_s = flat_length(edges)
    state = flat_state(levels, edges, supply_v)
    if length_s is None or state is None:
        return None
    at = f" at {format_value(levels.low_v, 'V')}" if levels else ""
    text = f"The output stays {state}{at} for the whole record of {format_value(length_s, 's')}."
    return _finding(f"stuck-{state}", text)


def _stopped(intervals: Intervals) -> Finding | None:
    last = intervals.standstill
    if last is None:
        return None
    length = format_value(last.at_least_s, "s")
    text = f"The output stops in the record: {last.kind} for its last {length}."
    return _finding(f"stuck-{last.kind}", text)


def _drifting(timing: Timing) -> Finding | None:
    drift = timing.drift
    if drift is None or abs(drift.value) <= expanded(drift):
        return None
    per_hour = format_measured(100 * 3600 * drift.value, 100 * 3600 * expanded(drift), "1/s")
    figures = per_hour.replace(" 1/s", "")
    return _finding("drifting", f"The period drifts by {figures} % an hour.")


def _disturbed(intervals: Intervals, code: str, words: tuple[str, ...]) -> Finding | None:
    hits = [drop for drop in intervals.dropped if any(word in drop.reason for word in words)]
    count = sum(drop.count for drop in hits)
    if not count:
        return None
    reasons = ", ".join(f"{drop.count} × {drop.reason}" for drop in hits)
    return _finding(code, f"Left out of the statistics: {reasons}.")
