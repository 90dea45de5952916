"""Edges of a trace: the crossings of the mid level with their uncertainty."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from benchtool.model.capture import LogicTrace, StampedTime, Trace, UniformTime, Waveform
from benchtool.model.timing import EdgeRun, Edges, Levels
from benchtool.timing.crossings import Crossings, find_crossings, find_runs
from benchtool.timing.levels import find_levels, levels_of, tell_missing
from benchtool.timing.placement import join_runs, place_edges
from benchtool.timing.survey import exceeds, survey_samples, widen
from benchtool.timing.tally import Tally
from benchtool.timing.thresholds import thresholds

_HIGH_FLAT_V = 1.0  # a flat trace above one volt counts as high (common practice)


def find_edges(trace: Trace, levels: Levels | None = None) -> Edges:
    """Find the edges of a trace.

    Args:
        trace: A waveform, or a logic trace whose times pass through.
        levels: Levels of the waveform; found where None. Not used for a logic trace.

    Returns:
        The edges; none for a waveform without two states, whose runs are still told.

    References:
        IEEE 181-2011: reference level instant by linear interpolation between the samples
        that bracket the level (clause 5.2.2, number from memory).
    """
    if isinstance(trace, LogicTrace):
        return _edges_of_logic(trace)
    edges = None
    if levels is None:
        levels, edges = find_levels_and_edges(trace)
    return _edges_at(trace, levels)[0] if edges is None else edges


def find_levels_and_edges(trace: Waveform) -> tuple[Levels, Edges | None]:
    """Find levels and edges of a waveform in one walk over its samples, seldom two.

    The levels of a long record are found in a part of it. The walk for the edges sees the range of
    all samples; where that goes beyond, levels and edges are found anew.

    Args:
        trace: The waveform.

    Returns:
        As ``find_levels`` and ``find_edges``; None for the edges of a capacitor node, which are
        its turning points.

    Raises:
        MeasurementError: If no sample is present (``no-samples``).
    """
    survey = survey_samples(trace)
    if not survey.runs and not survey.is_whole:
        levels = find_levels(trace)
        return levels, _walk_at(trace, levels)[0]
    levels = levels_of(trace, survey)
    edges, tally = _walk_at(trace, levels)
    if exceeds(trace, survey, tally):
        levels = levels_of(trace, widen(trace, survey, tally))
        edges, _ = _walk_at(trace, levels)
    levels = tell_missing(trace, levels, tally.n_missing)
    return levels, replace(edges, warnings=levels.warnings) if edges else None


def _walk_at(trace: Waveform, levels: Levels) -> tuple[Edges | None, Tally]:
    """Walk a waveform for its range, and for its edges where these are crossings."""
    return (None, find_runs(trace)[1]) if levels.kind == "node" else _edges_at(trace, levels)


def _edges_at(trace: Waveform, levels: Levels) -> tuple[Edges, Tally]:
    if levels.kind in ("flat", "noise"):
        return _no_edges(trace, levels)
    return _edges_of_waveform(trace, levels)


def _edges_of_logic(trace: LogicTrace) -> Edges:
    runs: list[EdgeRun] = []
    first = 0
    for span in trace.spans:
        stop = first + int(np.searchsorted(trace.times_s[first:], span.end_s, side="right"))
        runs.append(
            EdgeRun(
                first=first,
                stop=stop,
                start_s=span.start_s,
                end_s=span.end_s,
                starts_high=span.starts_high,
            )
        )
        first = stop
    return Edges(
        times_s=trace.times_s,
        rising=trace.states,
        u_s=np.zeros(trace.times_s.size),
        runs=tuple(runs),
        step_s=trace.tick_s,
        resolved=False,
        end_known=trace.end_known,
    )


def _edges_of_waveform(trace: Waveform, levels: Levels) -> tuple[Edges, Tally]:
    limits = thresholds(trace, levels)
    walked = find_crossings(trace, limits)
    found, lengths = walked.runs, walked.lengths
    crossings = join_runs(found)
    step_s = _grid_step(trace, found)
    holed = walked.tally.n_missing > 0
    placed = place_edges(trace, levels, limits, crossings, lengths, step_s, holed=holed)
    edges = Edges(
        times_s=placed.times_s,
        rising=crossings.rising,
        u_s=placed.u_s,
        runs=_edge_runs(found),
        step_s=step_s,
        resolved=placed.resolved,
        level_u_s=placed.level_u_s,
        stretch_u_rel=_stretch(trace, found[-1].end_s - found[0].start_s if found else 0.0),
        grid_s=placed.grid_s,
        n_runts=sum(run.n_runts for run in found),
        warnings=levels.warnings,
    )
    return edges, walked.tally


def _no_edges(trace: Waveform, levels: Levels) -> tuple[Edges, Tally]:
    extents, tally = find_runs(trace)
    is_high = levels.mid_v > (0.5 if trace.is_logic else _HIGH_FLAT_V)
    runs = tuple(
        EdgeRun(first=0, stop=0, start_s=start_s, end_s=end_s, starts_high=is_high)
        for start_s, end_s in extents
    )
    length_s = extents[-1][1] - extents[0][0] if extents else 0.0
    edges = Edges(
        times_s=np.empty(0),
        rising=np.empty(0, np.bool_),
        u_s=np.empty(0),
        runs=runs,
        step_s=_mean_step(trace, length_s),
        resolved=False,
        stretch_u_rel=_stretch(trace, length_s),
        warnings=levels.warnings,
    )
    return edges, tally


def _edge_runs(found: Sequence[Crossings]) -> tuple[EdgeRun, ...]:
    runs: list[EdgeRun] = []
    first = 0
    for run in found:
        stop = first + run.index.size
        runs.append(
            EdgeRun(
                first=first,
                stop=stop,
                start_s=run.start_s,
                end_s=run.end_s,
                starts_high=run.starts_high,
            )
        )
        first = stop
    return tuple(runs)


def _grid_step(trace: Waveform, found: Sequence[Crossings]) -> float:
    """Return the sample interval; of uneven samples the rms of those that hold an edge."""
    if isinstance(trace.time, UniformTime):
        return trace.time.dt_s
    steps = np.concatenate([run.after_s - run.before_s for run in found]) if found else np.empty(0)
    if steps.size:
        return float(np.sqrt(np.mean(steps**2)))
    return _mean_step(trace, found[-1].end_s - found[0].start_s if found else 0.0)


def _mean_step(trace: Waveform, length_s: float) -> float:
    if isinstance(trace.time, UniformTime):
        return trace.time.dt_s
    return length_s / max(1, trace.samples.size - 1)


def _stretch(trace: Waveform, length_s: float) -> float:
    """Return the relative uncertainty of all times from how few digits they were printed with.

    The first and the last stamp are rounded to ``q``: q·√(2/12) over the record's length.
    """
    if isinstance(trace.time, StampedTime):
        return trace.time.resolution_s * math.sqrt(2 / 12) / length_s if length_s > 0 else 0.0
    return trace.time.u_rel
