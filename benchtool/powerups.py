"""The first high of a capture of which it is stated that it begins before power-up."""

from __future__ import annotations

from dataclasses import replace

from benchtool.circuits import find_topology
from benchtool.model.quantity import Measured, Notice
from benchtool.model.result import StageResult
from benchtool.observation import Settings
from benchtool.timing import find_intervals, measure_timing

_LEAST_LONGER = 1.05  # times the others; a capacitor that was not discharged makes it no longer


def with_first_high(result: StageResult, settings: Settings) -> StageResult:
    """Return what was observed with the first high apart, whatever its length.

    A capture of unknown origin shows one only where its length looks like one.

    Args:
        result: What was observed in a capture that begins before power-up.
        settings: As settled for this run.

    Returns:
        The same where there is none, with a warning that says so.
    """
    if result.design is None or find_topology(result.design.topology).run is not None:
        return result
    if result.timing is not None and result.timing.first_high is not None:
        return result
    found = _rebuilt(result, settings)
    if found is not None:
        return found
    text = (
        "the capture of the power-up shows no first high longer than the others: it was left out. "
        "Record from before the supply comes up, the capacitor discharged"
    )
    return replace(result, warnings=(*result.warnings, Notice(code="no-first-high", text=text)))


def _rebuilt(result: StageResult, settings: Settings) -> StageResult | None:
    edges = result.edges
    if edges is None or not edges.runs or edges.runs[0].starts_high or not edges.times_s.size:
        return None
    intervals = find_intervals(edges, powered_s=float(edges.times_s[0]))
    timing = measure_timing(
        intervals, edges, timebase_rel=settings.timebase_rel, jitter_rel=settings.jitter_rel
    )
    first, usual = timing.first_high, timing.t_high
    if first is None:
        return None
    if isinstance(usual, Measured) and first.value < _LEAST_LONGER * usual.value:
        return None
    return replace(result, timing=timing, series=intervals)
