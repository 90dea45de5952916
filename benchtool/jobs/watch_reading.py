"""From the intervals since the last movement to a reading: figures, verdict, where it went."""

from __future__ import annotations

from dataclasses import replace

from benchtool.errors import SolveError
from benchtool.model.design import Design
from benchtool.model.judgement import Check
from benchtool.model.quantity import Measured
from benchtool.model.result import IntervalCounts, StageResult
from benchtool.model.watch import Goal, Heading, Reading, WatchPlan
from benchtool.timing import measure_jitter, measure_timing
from benchtool.uncertainty import expanded, propagate


def assess(reading: Reading, result: StageResult, plan: WatchPlan) -> Reading:
    """Return the reading with the figures that edges and intervals of a result give.

    Args:
        reading: The reading before.
        result: The trace; its edges and intervals are those since the last movement.
        plan: What is watched.
    """
    result = _judged(_timed(result, plan), plan)
    value = getattr(result.timing, plan.quantity, None)
    measured = value if isinstance(value, Measured) else None
    return replace(
        reading,
        value=value,
        n_averaged=measured.n if measured else 0,
        distance=measured.value - plan.goal.value if measured and plan.goal else None,
        check=next((item for item in result.checks if item.quantity == plan.quantity), None),
        verdict=result.verdict,
        result=result,
    )


def _timed(result: StageResult, plan: WatchPlan) -> StageResult:
    edges, series = result.edges, result.series
    if edges is None or series is None or not edges.times_s.size:
        return result
    timing = measure_timing(
        series, edges, timebase_rel=plan.timebase_rel, jitter_rel=plan.jitter_rel
    )
    counts = IntervalCounts(
        high=series.high_s.size,
        low=series.low_s.size,
        period=series.period_s.size,
        dropped=series.dropped,
    )
    return replace(
        result,
        timing=timing,
        jitter=measure_jitter(series, edges),
        intervals=counts,
        warnings=tuple(dict.fromkeys((*result.warnings, *timing.warnings))),
    )


def _judged(result: StageResult, plan: WatchPlan) -> StageResult:
    """Hold what was measured against the limits; products are solved for only if one is limited."""
    if plan.stage is None or plan.design is None or not plan.limits:
        return result
    from benchtool.judge import judge_stage, worst

    if any(limit.quantity.startswith("tau_") for limit in plan.limits):
        result = _solved(result, plan.design)
    checks: tuple[Check, ...] = judge_stage(
        plan.stage,
        plan.limits,
        timing=result.timing,
        jitter=result.jitter,
        solution=result.solution,
        rule=plan.rule,
        intervals=result.series,
        longest_flat_s=result.flat.length_s if result.flat else None,
        flat_state=result.flat.state if result.flat else None,
        timebase_rel=plan.timebase_rel,
    )
    return replace(result, checks=checks, verdict=worst(check.verdict for check in checks))


def _solved(result: StageResult, design: Design) -> StageResult:
    from benchtool.assessment import solve_stage

    try:
        return solve_stage(result, design)
    except SolveError:
        return result


def compare(reading: Reading, before: Measured | None) -> Reading:
    """Return the reading with what the last movement was, and where it went.

    Args:
        reading: The reading now.
        before: The average before the last movement, None where nothing moved yet.
    """
    value, goal = reading.value, reading.plan.goal
    if not isinstance(value, Measured):
        return replace(reading, change=None, heading="unmoved")
    change = None
    if before is not None:
        pairs = [(1.0, value), (-1.0, before)]
        change = propagate(value.value - before.value, value.unit, pairs)
    heading = "unmoved" if goal is None else _heading(value, before, change, goal)
    return replace(reading, change=change, heading=heading)


def _heading(
    value: Measured, before: Measured | None, change: Measured | None, goal: Goal
) -> Heading:
    now = value.value - goal.value
    if abs(now) <= expanded(value):
        return "there"
    if before is None or change is None:
        return "unmoved"
    if abs(change.value) <= max(expanded(change), expanded(value)):
        return "unclear"
    earlier = before.value - goal.value
    if now * earlier < 0:
        return "past"
    return "towards" if abs(now) < abs(earlier) else "away"
