"""Checks: each limit of a stage held against what was measured."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Literal

from benchtool.judge.observations import (
    JITTER_FIELDS,
    Observations,
    halt,
    limit_on_flat,
    longest_nominal,
    observe,
    stretch_without_end,
)
from benchtool.judge.reasons import (
    explain_bound,
    explain_decision,
    explain_halt,
    explain_nothing,
    explain_stretch,
)
from benchtool.judge.rules import (
    accept_bounds,
    conformance_probability,
    decide,
    guard_band,
    scatter_conformance_probability,
)
from benchtool.model.decision import StageLimit
from benchtool.model.design import Rule, Stage
from benchtool.model.judgement import Check, Solution, VerdictName
from benchtool.model.options import TIMEBASE_REL
from benchtool.model.quantity import Bound, Measured, Notice, Quantity
from benchtool.model.timing import Intervals, Jitter, Timing
from benchtool.units import format_value

DEFAULT_RULE = Rule()


def judge_stage(  # noqa: PLR0913 - each record that a capture gives is an argument of its own
    stage: Stage,
    limits: Sequence[StageLimit],
    *,
    timing: Timing | None,
    jitter: Jitter | None = None,
    solution: Solution | None = None,
    rule: Rule = DEFAULT_RULE,
    intervals: Intervals | None = None,
    longest_flat_s: float | None = None,
    flat_state: Literal["high", "low"] | None = None,
    timebase_rel: float = TIMEBASE_REL,
) -> tuple[Check, ...]:
    """Hold what was measured on a stage against its limits, one check a limit.

    Args:
        stage: The stage; its topology says whether the output must keep changing.
        limits: Its limits, given and derived.
        timing: Measured times or bounds; None where the trace has no wave.
        jitter: Measured scatter, or None.
        solution: The products of the parts, or None.
        rule: Decision rule.
        intervals: For the intervals cut by the ends of the record, lower bounds of a dying or
            slow output.
        longest_flat_s: Length in seconds of a record without an edge.
        flat_state: The state of that record; None where it lies between high and low, which
            makes it unusable.
        timebase_rel: Half-width of the timebase error, relative, for the guard band of bounds.

    Returns:
        The checks in the order of ``limits``; too few transitions give verdicts, never errors.

    References:
        JCGM 106:2012, clauses 7 and 8; ILAC-G8:09/2019, clause 4.2.
    """
    seen = Observations(
        topology=stage.topology,
        nominal_s=longest_nominal(limits),
        timing=timing,
        jitter=jitter,
        solution=solution,
        intervals=intervals,
        flat_s=longest_flat_s,
        flat_state=flat_state,
    )
    uppers = {limit.quantity: limit.upper for limit in limits}
    bound_w_rel = guard_band(timebase_rel / 3**0.5, float("inf"), rule)
    return tuple(_check(limit, seen, rule, uppers, bound_w_rel) for limit in limits)


def _check(
    limit: StageLimit,
    seen: Observations,
    rule: Rule,
    uppers: Mapping[str, float | None],
    bound_w_rel: float,
) -> Check:
    measured = observe(limit.quantity, seen)
    if limit.relative:
        absolute = _of_period(limit, observe("period", seen))
        if absolute is None:
            return _nothing(limit, seen)
        limit = absolute
    if limit.lower is None and limit.upper is None:
        return _without_decision(limit, measured, "undecided", _no_limit(limit))
    stopped = _stopped(limit, seen, uppers, bound_w_rel)
    if isinstance(measured, Measured):
        return _measured_check(limit, measured, rule, stopped)
    if stopped is not None:
        return _without_decision(limit, measured, "fail", stopped)
    if measured is not None:
        return _bound_check(limit, measured, bound_w_rel)
    return _nothing(limit, seen)


def _of_period(limit: StageLimit, period: Quantity | None) -> StageLimit | None:
    """Return a limit stated as a share of the mean period in seconds."""
    if not isinstance(period, Measured):
        return None
    shares = [share for share in (limit.lower, limit.upper) if share is not None]
    text = " to ".join(format_value(share, "1", 6) for share in shares)
    return replace(
        limit,
        lower=None if limit.lower is None else limit.lower * period.value,
        upper=None if limit.upper is None else limit.upper * period.value,
        unit="s",
        relative=False,
        source=f"{limit.source} ({text} of the measured mean period)",
    )


def _nothing(limit: StageLimit, seen: Observations) -> Check:
    """Return the check of a quantity with neither value nor bound.

    The reason says whether a further record would settle it.
    """
    reason = explain_nothing(limit.quantity, sound=seen.sound, between=seen.between_states)
    return _without_decision(limit, None, "unusable", reason)


def _no_limit(limit: StageLimit) -> str:
    return f"The tolerances allow a circuit that never switches, so {limit.quantity} has no limit."


def _stopped(
    limit: StageLimit, seen: Observations, uppers: Mapping[str, float | None], w_rel: float
) -> str | None:
    """Return the reason where the output stood still for longer than the limits allow."""
    if halted := halt(seen):
        return explain_halt(limit.quantity, halted)
    length_s = stretch_without_end(limit.quantity, seen)
    if length_s is not None and _outlasts(length_s, limit.upper, w_rel):
        return explain_stretch(limit.quantity, length_s, limit.upper or 0.0, whole=False)
    name = limit_on_flat(limit.quantity, seen)
    if name is None or seen.flat_s is None:
        return None
    # Longer than the whole period is longer than either part of it.
    longest_s = uppers.get(name) or uppers.get("period")
    if longest_s is None or not _outlasts(seen.flat_s, longest_s, w_rel):
        return None
    return explain_stretch(limit.quantity, seen.flat_s, longest_s, whole=True)


def _outlasts(length_s: float, upper_s: float | None, w_rel: float) -> bool:
    return upper_s is not None and length_s > upper_s + w_rel * length_s


def _measured_check(
    limit: StageLimit, measured: Measured, rule: Rule, stopped: str | None
) -> Check:
    w = guard_band(measured.u, measured.dof, rule)
    decision = decide(measured.value, w, limit.lower, limit.upper, rule.name)
    probability = (
        scatter_conformance_probability
        if limit.quantity in JITTER_FIELDS
        else conformance_probability
    )
    p = probability(measured, limit.lower, limit.upper)
    reason = explain_decision(limit.quantity, measured, decision, rule, p)
    if stopped is not None and decision.verdict != "fail":
        return _without_decision(limit, measured, "fail", stopped, w)
    return Check(
        quantity=limit.quantity,
        measured=measured,
        lower=limit.lower,
        upper=limit.upper,
        unit=limit.unit,
        accept_lower=decision.accept_lower,
        accept_upper=decision.accept_upper,
        source=limit.source,
        p_conform=p,
        verdict=decision.verdict,
        reason=reason,
        nominal=limit.nominal,
        warnings=(*limit.warnings, *(() if decision.zone else (_narrow(limit, w),))),
    )


def _narrow(limit: StageLimit, w: float) -> Notice:
    lower, upper = limit.lower or 0.0, limit.upper or 0.0
    return Notice(
        code="limits-narrower-than-u",
        text=(
            f"the limits on {limit.quantity} are {format_value(upper - lower, limit.unit, 3)} "
            f"apart and the guard band takes {format_value(w, limit.unit, 2)} from each side: "
            "nothing can pass"
        ),
    )


def _bound_check(limit: StageLimit, bound: Bound, w_rel: float) -> Check:
    verdict = _bound_verdict(limit, bound, w_rel)
    reason = explain_bound(limit.quantity, bound, limit.lower, limit.upper, verdict)
    return _without_decision(limit, bound, verdict, reason)


def _bound_verdict(limit: StageLimit, bound: Bound, w_rel: float) -> VerdictName:
    """Compare what the quantity may still be with the limits, the timebase as guard band."""
    least, most = bound.at_least, bound.at_most
    low_side = _held(least, most, limit.lower, w_rel)
    high_side = _held(_negated(most), _negated(least), _negated(limit.upper), w_rel)
    if "fail" in (low_side, high_side):
        return "fail"
    return "undecided" if "undecided" in (low_side, high_side) else "pass"


def _held(
    least: float | None, most: float | None, lower: float | None, w_rel: float
) -> VerdictName:
    """Say whether a quantity between ``least`` and ``most`` keeps a lower limit."""
    if lower is None or (least is not None and least - w_rel * abs(least) >= lower):
        return "pass"
    return "fail" if most is not None and most + w_rel * abs(most) < lower else "undecided"


def _negated(value: float | None) -> float | None:
    return None if value is None else -value


def _without_decision(
    limit: StageLimit,
    measured: Quantity | None,
    verdict: VerdictName,
    reason: str,
    w: float = 0.0,
) -> Check:
    accept_lower, accept_upper, _ = accept_bounds(w, limit.lower, limit.upper)
    return Check(
        quantity=limit.quantity,
        measured=measured,
        lower=limit.lower,
        upper=limit.upper,
        unit=limit.unit,
        accept_lower=accept_lower,
        accept_upper=accept_upper,
        source=limit.source,
        p_conform=None,
        verdict=verdict,
        reason=reason,
        nominal=limit.nominal,
        warnings=limit.warnings,
    )
