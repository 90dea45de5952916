"""What a watch is about: the quantity, its goal and its limits."""

from __future__ import annotations

from typing import TYPE_CHECKING, get_args

from benchtool.errors import UsageError
from benchtool.model.design import Rule
from benchtool.model.watch import WATCHED_UNITS, Goal, WatchedName, WatchPlan
from benchtool.observation import Settings
from benchtool.targets import choose_one_stage

if TYPE_CHECKING:
    from benchtool.model.decision import StageLimit
    from benchtool.model.design import Design, Stage

GoalUnit = tuple[float, str]
"""A value with its SI unit: s, Hz or 1."""

_BY_UNIT: dict[str, WatchedName] = {"s": "period", "Hz": "frequency", "1": "duty"}
_WHY = "and one trimmer is watched at a time"


def plan_watch(
    settings: Settings,
    design: Design | None,
    *,
    stage: str | None = None,
    goal: GoalUnit | None = None,
    quantity: WatchedName | None = None,
) -> WatchPlan:
    """Settle what is watched, where it is to go, and what it must keep.

    Args:
        settings: As settled for this run.
        design: The design, where there is one.
        stage: Name of the stage to watch.
        goal: Where the quantity is to go; without it the design's nominal value.
        quantity: What is watched; without it what the goal's unit or the design suggests.

    Raises:
        UsageError: If the goal is of another unit than the quantity (``goal-unit``), or the stage
            is not known (``choose-stage``, ``no-such-stage``).
    """
    chosen = choose_one_stage(design, stage, _WHY)
    name = quantity or _suggested(goal, chosen)
    if goal is not None and goal[1] != WATCHED_UNITS[name]:
        raise UsageError(
            f"the goal is in {_said(goal[1])} and {name} is in {_said(WATCHED_UNITS[name])}",
            hint=f"Give --goal in {_said(WATCHED_UNITS[name])}, or another --quantity.",
            code="goal-unit",
        )
    limits: tuple[StageLimit, ...] = ()
    aim = Goal(value=goal[0], source="--goal") if goal else None
    if design is not None and chosen is not None:
        from benchtool.judge import stage_limits

        limits = stage_limits(chosen, design)
        aim = aim or _nominal(name, chosen, design)
    return WatchPlan(
        quantity=name,
        goal=aim,
        design=design,
        stage=chosen,
        limits=limits,
        rule=design.rule if design else Rule(),
        timebase_rel=settings.timebase_rel,
        jitter_rel=settings.jitter_rel,
        instrument=settings.options.instrument,
    )


def _suggested(goal: GoalUnit | None, stage: Stage | None) -> WatchedName:
    if goal is not None:
        one_shot = goal[1] == "s" and stage is not None and stage.topology == "one-shot"
        return "t_high" if one_shot else _BY_UNIT[goal[1]]
    if stage is None:
        return "period"
    if stage.topology in ("one-shot", "power-on"):
        return "t_high"
    limited = [*(limit.quantity for limit in stage.limits), *stage.quantities]
    names: tuple[WatchedName, ...] = get_args(WatchedName)
    return next((name for name in names if name in limited), "period")


def _nominal(name: WatchedName, stage: Stage, design: Design) -> Goal | None:
    """Return the value that the parts of the drawing give; None of a circuit that is stuck."""
    from benchtool.circuits import circuit_at, predict

    value = getattr(predict(circuit_at(stage, design)), name, None)
    if value is None or not 0 < float(value) < float("inf"):
        return None
    return Goal(value=float(value), source="nominal of the design")


def _said(unit: str) -> str:
    return {"s": "seconds", "Hz": "hertz", "1": "percent"}[unit]
