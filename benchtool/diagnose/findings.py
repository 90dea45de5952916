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
    from benchtool.model.regularity import Jumps, Line, Lock, Regularity, Skip

STUCK_HIGH_SHARE = 0.6
STUCK_LOW_SHARE = 0.3

_MAY_BE: dict[str, tuple[str, ...]] = {
    "stuck-high": ("C-short", "C-leaky", "RA-open", "RB-open", "R-open", "control-high"),
    "stuck-low": ("node-leak-to-supply", "discharge-weak", "lower-threshold", "control-low"),
    "drifting": ("C-leaky", "C-low", "control-bypass-missing"),
    "missed-edge": ("supply-ripple", "control-bypass-missing", "lower-threshold"),
    "false-trigger": ("supply-ripple", "control-bypass-missing"),
    "ripple-lock": ("supply-ripple", "control-bypass-missing"),
    "ripple-line": ("supply-ripple", "control-bypass-missing"),
    "paused": ("supply-ripple", "RA-open", "RB-open", "R-open", "C-short"),
    "two-level": ("RA-high", "RB-high", "R-high", "C-low"),
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
    regularity: Regularity | None = None,
) -> tuple[Finding, ...]:
    """Return what is seen in a trace.

    Args:
        levels: Levels of the waveform, None for a logic trace.
        edges: Its edges.
        intervals: Its intervals.
        timing: The figures made of them.
        supply_v: Supply of the board in volts, where known.
        topology: The circuit, where known: faults that it cannot have are left out.
        regularity: What the order of the edges says, where it was looked at.
    """
    missed = _disturbed(intervals, "missed-edge", (_MISSED,))
    candidates = (
        _stuck(levels, edges, supply_v),
        _stopped(intervals) if topology and topology not in _RESTING else None,
        _drifting(timing),
        *((missed,) if regularity is None else _irregular(regularity, missed)),
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


def _irregular(regularity: Regularity, missed: Finding | None) -> tuple[Finding | None, ...]:
    """Return what the order of the edges shows; skips that it explains are not told twice."""
    return (
        *(_skipped(regularity.skips) if regularity.skips else (missed,)),
        _locked(regularity.lock) if regularity.lock else None,
        *(_followed(line) for line in regularity.lines),
        _jumping(regularity.jumps) if regularity.jumps else None,
    )


def _skipped(skips: tuple[Skip, ...]) -> tuple[Finding | None, ...]:
    missed = [skip for skip in skips if skip.kind != "paused"]
    paused = [skip for skip in skips if skip.kind == "paused"]
    return (_missed(missed) if missed else None, _paused(paused) if paused else None)


def _missed(skips: list[Skip]) -> Finding:
    at = format_value(skips[0].at_s, "s")
    if any(skip.kind == "unclear" for skip in skips):
        after = "whether the board paused there cannot be told, for its periods scatter too much"
    else:
        after = "the later pulses keep the phase of the earlier ones, so the board went on counting"
    return _finding("missed-edge", f"{len(skips)} gaps in the pulses, first at {at}: {after}.")


def _paused(skips: list[Skip]) -> Finding:
    first = skips[0]
    at, length = format_value(first.at_s, "s"), format_value(first.length_s, "s")
    text = (
        f"The board stood still {len(skips)} times, first at {at} for {length}: the later pulses "
        f"are shifted by {100 * first.shift.value:+.1f} % of a period."
    )
    return _finding("paused", text)


def _locked(lock: Lock) -> Finding:
    text = (
        f"The period is {lock.cycles} periods of {format_value(lock.ripple_hz, 'Hz')} and scatters "
        f"by only {format_value(lock.scatter_rel, '1', 2)} of itself: the board follows a ripple."
    )
    return _finding("ripple-lock", text)


def _followed(line: Line) -> Finding:
    at = format_measured(line.frequency.value, expanded(line.frequency), "Hz")
    whose = {
        "mains": f", a multiple of the mains' {line.of_hz or 0:.0f} Hz",
        "supply": ", the ripple of the supply",
        "unknown": "",
    }[line.source]
    others = f" ({line.n_others} other frequencies would do as well)" if line.n_others else ""
    size = format_value(line.amplitude_s, "s", 2)
    return _finding(
        "ripple-line", f"The intervals go up and down by {size} at {at}{whose}{others}."
    )


def _jumping(jumps: Jumps) -> Finding:
    lower, upper = format_value(jumps.lower_s, "s"), format_value(jumps.upper_s, "s")
    share = 100 * (jumps.upper_s / jumps.lower_s - 1)
    text = (
        f"The period has two values, {lower} and {upper} ({share:.2g} % apart), with nothing "
        f"between them; it changes {jumps.n_jumps} times from one to the other."
    )
    return _finding("two-level", text)
