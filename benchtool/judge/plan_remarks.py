"""What stands in the way of a planned measurement, and what was assumed for it."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

from benchtool.judge.plan_record import ROOM
from benchtool.judge.plan_sampling import edge_length
from benchtool.judge.rules import accept_bounds
from benchtool.model.decision import StageLimit
from benchtool.model.design import Design, Stage
from benchtool.model.plan import Means, StagePlan
from benchtool.model.quantity import Notice
from benchtool.units import format_value

_LEAST_SAMPLES = 4.0  # in a period: below, measuring refuses
_SLOW = 0.03  # of a repetition, from 20 % to 80 % of an edge
_NOISY = 1 / 8  # of the swing: from here noise crosses the reference levels


def remark(
    plan: StagePlan, stage: Stage, design: Design, means: Means, limits: Sequence[StageLimit]
) -> Iterator[Notice]:
    """Yield the warnings of a plan.

    Args:
        plan: The plan without them.
        stage: Its stage.
        design: Its design.
        means: What there is to measure with.
        limits: What is judged.
    """
    yield from dict.fromkeys(notice for limit in limits for notice in limit.warnings)
    yield from _of_time(plan)
    yield from _of_rate(plan, design, means)
    yield from _of_room(plan)
    if means.period_sd_rel is None:
        text = (
            "no scatter of the periods was given: a jitter of "
            f"{format_value(means.jitter_rel, '1', 2)} (half-width) was assumed"
        )
        yield Notice(code="assumed-jitter", text=text)
    yield from _of_jitter(plan, means)
    if any(limit.quantity.startswith("jitter_") for limit in stage.limits):
        yield Notice(
            code="jitter-not-planned",
            text="limits on jitter are left out of the plan: only a capture shows a board's jitter",
        )


def _of_jitter(plan: StagePlan, means: Means) -> Iterator[Notice]:
    """Warn where measuring one interval will assume less jitter than there is."""
    given = means.period_sd_rel or 0.0
    if given > means.jitter_rel / math.sqrt(3) and any(item.n == 1 for item in plan.quantities):
        yield Notice(
            code="jitter-above-assumed",
            text=f"measuring one interval assumes {format_value(means.jitter_rel, '1', 2)} of "
            "jitter (half-width) and will state too small a U beside "
            f"{format_value(given, '1', 2)}: "
            "state [instrument] jitter in the design, or record more periods",
        )


def _of_time(plan: StagePlan) -> Iterator[Notice]:
    missing = [item.quantity for item in plan.quantities if not item.n]
    if missing:
        yield Notice(
            code="no-interval-sure",
            text=f"a record of {format_value(plan.span_s, 's', 3)} may hold no whole interval for "
            f"{', '.join(missing)}: boards will be undecided, or found too slow",
        )
    elif any(item.n == 1 for item in plan.quantities) and plan.unit != "delay":
        yield Notice(
            code="single-interval",
            text="one interval is all that some figures rest on: their scatter is assumed and not "
            "seen",
        )
    wanted = plan.repetition.n
    if plan.n_in_time is not None and plan.n_in_time < wanted:
        yield Notice(
            code="time-too-short",
            text=f"{format_value(plan.time_per_board_s or 0.0, 's', 3)} a board hold "
            f"{plan.n_in_time} whole {_plural(plan.unit, plan.n_in_time)}, and {wanted} are needed",
        )


def _plural(word: str, n: int) -> str:
    return word if n == 1 else f"{word}s"


def _of_rate(plan: StagePlan, design: Design, means: Means) -> Iterator[Notice]:
    per_unit = plan.rate_hz * plan.unit_s
    if per_unit < _LEAST_SAMPLES:
        yield Notice(
            code="rate-too-low",
            text=f"at {format_value(plan.rate_hz, 'Hz', 3)} a {plan.unit} holds {per_unit:.2g} "
            "samples, and measuring refuses fewer than 4",
        )
    if edge_length(means) > _SLOW * plan.unit_s:
        yield Notice(
            code="slow-edges",
            text=f"edges of {format_value(edge_length(means), 's', 2)} are no small part of a "
            f"{plan.unit}: the levels hardly settle, and U will be larger than planned",
        )
    if means.noise_v > _NOISY * design.supply.nominal:
        yield Notice(
            code="noise-hides-edges",
            text=f"noise of {format_value(means.noise_v, 'V', 2)} on a swing of "
            f"{format_value(design.supply.nominal, 'V', 3)} crosses the reference levels: edges "
            "would be found where there are none",
        )


def _of_room(plan: StagePlan) -> Iterator[Notice]:
    for item in plan.quantities:
        if item.w is not None and not accept_bounds(item.w, item.lower, item.upper)[2]:
            yield Notice(
                code="limits-narrower-than-u",
                text=f"the guard band leaves nothing between the limits on {item.quantity}: no "
                "board can pass",
            )
        elif item.room is not None and item.room < ROOM:
            yield Notice(
                code="little-room",
                text=f"half the distance between the limits on {item.quantity} is {item.room:.2g} "
                f"times U, less than {ROOM:g}: the guard band costs good boards",
            )
