"""The state of a watch as a fold over what the captures show: no clock, no key, no screen."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace
from itertools import pairwise
from typing import Literal

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.jobs.watch_counts import join_counted, readings_of, scatter_of, with_figures
from benchtool.jobs.watch_edges import are_alike, edges_from, join_edges
from benchtool.jobs.watch_movement import Course, Scatter, follow
from benchtool.jobs.watch_reading import assess, compare
from benchtool.jobs.watch_sight import Sight
from benchtool.model.arrays import FloatArray, middle
from benchtool.model.counted import Counted
from benchtool.model.quantity import Measured, Notice
from benchtool.model.timing import Edges, Intervals
from benchtool.model.watch import MOST_POINTS, Mark, Point, Reading, WatchedName, WatchPlan
from benchtool.timing import find_intervals

PIECE_S = 0.3
"""Intervals that begin within this time are one reading: no hand turns a trimmer twice in it."""

REST = 10
"""Captures without a movement that part one movement from the next: a hand that turns slowly makes
many small ones."""

_MOST_PIECES = 64
_ARRIVALS = 6
_HALTED = 3.0  # periods without an edge after which nothing is left of the average


@frozen_record(eq=False)
class WatchState:
    """All that a watch knows.

    Attributes:
        reading: What is shown of it.
        edges: The edges since the last movement.
        folded_s: Up to where their intervals have been tested, on the common axis.
        course: What the test for movements knows.
        before: The average before the last movement; movements the same way that follow each other
            without a rest are one.
        n_rested: Captures since the last movement.
        arrivals_s: When the last new intervals came.
        counted: Of a counter, its readings since the last movement.
    """

    reading: Reading
    edges: Edges | None = None
    folded_s: float = -math.inf
    course: Course = Course()
    before: Measured | None = None
    n_rested: int = REST
    arrivals_s: tuple[float, ...] = ()
    counted: Counted | None = None


def begin(plan: WatchPlan) -> WatchState:
    """Return the state before the first capture."""
    return WatchState(reading=Reading(plan=plan))


def advance(state: WatchState, sight: Sight) -> WatchState:
    """Return the state after a further capture.

    Args:
        state: The state before it.
        sight: What it shows.
    """
    reading = replace(
        state.reading,
        n_updates=state.reading.n_updates + 1,
        moved=False,
        source=sight.source,
        trouble=sight.trouble,
    )
    state = replace(state, reading=reading)
    if sight.is_anew:
        state = _cleared(state)
    if sight.result is not None and sight.result.counted is not None:
        return _counted(state, sight, sight.result.counted)
    edges = sight.edges
    if edges is None or sight.result is None:
        return state
    goes_on = sight.offset_s is not None and state.edges is not None
    if not edges.times_s.size and not goes_on:
        return _without_edges(state, sight)
    if state.edges is not None and not are_alike(state.edges, edges):
        state = _cleared(state)
    joined = join_edges(state.edges, edges, sight.offset_s)
    active = sight.result.series.active if sight.result.series else "high"
    return _folded(replace(state, edges=joined), sight, active)


def _counted(state: WatchState, sight: Sight, counted: Counted) -> WatchState:
    """Take a run of a counter: one reading of the watch, averaged with those since a movement."""
    plan, course = state.reading.plan, state.course
    values = readings_of(counted, plan.quantity)
    if not values.size or sight.result is None:
        text = f"this counter does not count the {plan.quantity}; choose another --quantity"
        return hinder(state, Notice(code="not-counted", text=text))
    course, moved = follow(course, values, scatter_of(counted, plan, values))
    known = None if moved else state.counted
    joined = join_counted(known, counted)
    points = (*state.reading.points, Point(value=float(np.mean(values)), moved=moved))
    reading = assess(state.reading, with_figures(sight.result, joined, plan), plan)
    reading = replace(reading, moved=moved, points=points[-MOST_POINTS:])
    before = _before(state, reading)
    state = replace(
        state,
        counted=joined,
        course=course,
        before=before,
        reading=compare(reading, before),
        n_rested=0 if moved else state.n_rested + 1,
    )
    return _arrived(state, sight.at_s)


def _cleared(state: WatchState) -> WatchState:
    """Let go of all edges, since those to come cannot be joined to them."""
    return replace(state, edges=None, folded_s=-math.inf, course=_afresh(state.course))


def _afresh(course: Course) -> Course:
    """Return what is left where a new average begins: how much intervals scatter."""
    return Course(scatter_rel2=course.scatter_rel2, dof=course.dof)


def _without_edges(state: WatchState, sight: Sight) -> WatchState:
    """Take a capture in which nothing happens: too short to say more, or a board that stands."""
    result, plan = sight.result, state.reading.plan
    assert result is not None
    length_s = result.trace.duration_s if result.trace else 0.0
    known = state.reading.value
    if isinstance(known, Measured) and state.edges is not None:
        period_s = _usual_period(state.edges)
        if period_s is None or length_s < _HALTED * period_s:
            return state
    before = known if isinstance(known, Measured) else state.before
    reading = replace(
        assess(state.reading, result, plan),
        moved=isinstance(known, Measured),
        came_at_s=sight.at_s,
        every_s=None,
    )
    course = _afresh(state.course)
    return WatchState(reading=compare(reading, before), course=course, before=before)


def _usual_period(edges: Edges) -> float | None:
    if edges.times_s.size < 3:
        return None
    return 2 * float(np.mean(np.diff(edges.times_s)))


def _folded(state: WatchState, sight: Sight, active: Literal["high", "low"]) -> WatchState:
    """Test the intervals that are new, drop what lies before a movement, and average the rest."""
    plan, edges, course = state.reading.plan, state.edges, state.course
    assert edges is not None
    assert sight.result is not None
    fresh = find_intervals(edges_from(edges, state.folded_s), active=active)
    starts_s, lengths_s, values = _series(fresh, plan.quantity)
    points, moved_s = list(state.reading.points), None
    scatter = _scatter(plan, edges, values)
    for at, piece in _pieces(starts_s, values):
        course, moved = follow(course, piece, scatter)
        moved_s = at if moved else moved_s
        points.append(Point(value=_shown(piece, plan.quantity), moved=moved))
    if moved_s is not None:
        edges = edges_from(edges, moved_s)
    intervals = find_intervals(edges, active=active)
    if intervals.standstill is not None:  # nothing is left of the average but the last edge
        edges = edges_from(edges, float(edges.times_s[-1]))
        intervals, course = find_intervals(edges, active=active), _afresh(course)
    result = replace(sight.result, edges=edges, series=intervals)
    reading = assess(state.reading, result, plan)
    reading = replace(reading, moved=moved_s is not None, points=tuple(points[-MOST_POINTS:]))
    before = _before(state, reading)
    state = replace(state, edges=edges, course=course, before=before)
    state = replace(state, reading=compare(reading, before))
    if not starts_s.size:
        return state
    folded_s = float((starts_s + lengths_s).max())
    n_rested = state.n_rested + 1 if moved_s is None else 0
    return _arrived(replace(state, folded_s=folded_s, n_rested=n_rested), sight.at_s)


def _before(state: WatchState, reading: Reading) -> Measured | None:
    """Return where the movement began that the last readings belong to."""
    known, value = state.reading.value, reading.value
    if not reading.moved or not isinstance(known, Measured):
        return state.before
    if state.before is None or state.n_rested >= REST or not isinstance(value, Measured):
        return known
    goes_on = (value.value - known.value) * (known.value - state.before.value) > 0
    return state.before if goes_on else known


def _series(found: Intervals, quantity: WatchedName) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return starts, lengths and values of the intervals that give the quantity."""
    if quantity == "t_high":
        return found.high_starts_s, found.high_s, found.high_s
    if quantity == "t_low":
        return found.low_starts_s, found.low_s, found.low_s
    if quantity == "duty":
        return found.period_starts_s, found.period_s, found.cycle_high_s / found.period_s
    return found.period_starts_s, found.period_s, found.period_s


def _shown(values: FloatArray, quantity: WatchedName) -> float:
    mean = float(np.mean(values))
    return 1 / mean if quantity == "frequency" else mean


def _pieces(starts_s: FloatArray, values: FloatArray) -> Iterator[tuple[float, FloatArray]]:
    """Yield the start and the values of each reading."""
    if not starts_s.size:
        return
    length_s = max(PIECE_S, float(starts_s[-1] - starts_s[0]) / _MOST_PIECES)
    number = np.floor((starts_s - starts_s[0]) / length_s)
    cuts = [0, *(np.flatnonzero(np.diff(number)) + 1).tolist(), starts_s.size]
    for first, stop in pairwise(cuts):
        yield float(starts_s[first]), values[first:stop]


def _scatter(plan: WatchPlan, edges: Edges, values: FloatArray) -> Scatter:
    """Return what is known of the scatter beforehand; two edges bound each interval."""
    typical = middle(values) if values.size else math.inf
    grid_s = edges.grid_s if edges.resolved else edges.step_s
    noise_s = float(np.sqrt(np.mean(edges.u_s**2))) if edges.u_s.size else 0.0
    least_s = math.hypot(grid_s / math.sqrt(6), math.sqrt(2) * noise_s)
    if plan.quantity == "duty":
        least_s /= _usual_period(edges) or math.inf
    return Scatter(
        assumed_rel=plan.jitter_rel / math.sqrt(3),
        least_rel=least_s / typical,
        negligible_rel=0.0 if plan.quantity == "duty" else plan.timebase_rel / math.sqrt(3),
    )


def _arrived(state: WatchState, at_s: float) -> WatchState:
    """Note when new intervals came, and with that when the next are due."""
    arrivals_s = (*state.arrivals_s, at_s)[-_ARRIVALS:]
    every_s = _usual_period(state.edges) if state.edges is not None else None
    if len(arrivals_s) > 1:
        every_s = middle(np.diff(np.array(arrivals_s)))
    reading = replace(state.reading, came_at_s=at_s, every_s=every_s)
    return replace(state, arrivals_s=arrivals_s, reading=reading)


def hinder(state: WatchState, trouble: Notice) -> WatchState:
    """Note why no capture came; the average stays."""
    return replace(state, reading=replace(state.reading, trouble=trouble))


def mark(state: WatchState) -> WatchState:
    """Keep the present average as a mark; without one nothing changes."""
    value, marks = state.reading.value, state.reading.marks
    if not isinstance(value, Measured):
        return state
    marks = (*marks, Mark(number=len(marks) + 1, value=value))
    return replace(state, reading=replace(state.reading, marks=marks))


def unmark(state: WatchState) -> WatchState:
    """Take back the last mark."""
    marks = state.reading.marks[:-1]
    return replace(state, reading=replace(state.reading, marks=marks))
