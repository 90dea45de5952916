"""Do the limits leave room: for the nominal board, for the tolerances, for the uncertainty."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping

import numpy as np

from benchtool.judge.extremes import draw_boards
from benchtool.judge.limits import stage_limits
from benchtool.judge.observations import JITTER_FIELDS
from benchtool.judge.responses import UNITS
from benchtool.judge.rules import accept_bounds, guard_band
from benchtool.model.arrays import FloatArray
from benchtool.model.decision import Concern, StageLimit
from benchtool.model.design import Design, Limit, Stage
from benchtool.model.options import TIMEBASE_REL
from benchtool.units import format_value

TRIALS = 100_000
REJECTED = 0.005
"""Share of good boards outside a stated limit from which it is worth a word."""


def examine_limits(stage: Stage, design: Design, u_rel: float | None) -> Iterator[Concern]:
    """Yield concerns about the limits of a stage that runs nominally.

    Args:
        stage: A stage of ``design``.
        design: Gives the decision rule and the instrument.
        u_rel: Relative standard uncertainty to expect; None takes that of the timebase.
    """
    limits = stage_limits(stage, design)
    stated = {limit.quantity for limit in stage.limits}
    boards = draw_boards(stage, design, TRIALS) if stated - set(JITTER_FIELDS) else {}
    w_rel = guard_band(_least_u_rel(design) if u_rel is None else u_rel, math.inf, design.rule)
    without_u = {*JITTER_FIELDS, "duty"} if u_rel is None else set(JITTER_FIELDS)
    yield from _underivable(stage, {limit.quantity for limit in limits})
    for limit in limits:
        if limit.quantity not in without_u:  # the timebase cancels in the duty
            yield from _narrower_than_u(stage, limit, w_rel)
        if limit.quantity in stated:
            yield from _stated(stage, limit, boards)


def _least_u_rel(design: Design) -> float:
    half_width = design.instrument.timebase_rel
    return (TIMEBASE_REL if half_width is None else half_width) / math.sqrt(3)


def _key(stage: Stage, limit: StageLimit | Limit) -> str:
    return f"stage.{stage.name}.limits.{limit.quantity}"


def _underivable(stage: Stage, known: set[str]) -> Iterator[Concern]:
    for name in stage.quantities:
        if name not in known:
            yield Concern(
                severity="error",
                key=f"stage.{stage.name}.limits.quantities",
                text=f"No limit on {name} can be derived for the topology {stage.topology}.",
                hint=f"Take {name} out of quantities, or state its limit.",
            )


def _narrower_than_u(stage: Stage, limit: StageLimit, w_rel: float) -> Iterator[Concern]:
    if limit.nominal is None or limit.lower is None or limit.upper is None:
        return
    w = w_rel * limit.nominal
    if accept_bounds(w, limit.lower, limit.upper)[2]:
        return
    yield Concern(
        severity="error",
        key=_key(stage, limit),
        text=(
            f"The limits on {limit.quantity} are "
            f"{format_value(limit.upper - limit.lower, limit.unit, 3)} apart and the guard band "
            f"takes {format_value(w, limit.unit, 2)} from each side: no board can pass."
        ),
        hint="Widen the limits, measure with a better timebase, or lower the guard factor.",
    )


def _stated(stage: Stage, limit: StageLimit, boards: Mapping[str, FloatArray]) -> Iterator[Concern]:
    row = boards.get(limit.quantity)
    if row is None:
        if limit.quantity in UNITS:
            yield _no_such_time(stage, limit)
        return
    impossible = _impossible_duty(stage, limit)
    if impossible is not None:
        yield impossible
    elif not _inside(np.array([limit.nominal]), limit).all():
        yield _nominal_outside(stage, limit)
    else:
        share = 1 - float(_inside(row, limit).mean())
        if share > REJECTED:
            yield _good_boards_outside(stage, limit, share)


def _inside(row: FloatArray, limit: StageLimit) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
    """Return which boards lie inside a limit; one that is stuck does not."""
    low = -math.inf if limit.lower is None else limit.lower
    high = math.inf if limit.upper is None else limit.upper
    found: np.ndarray[tuple[int], np.dtype[np.bool_]] = (row >= low) & (row <= high)
    return found


def _no_such_time(stage: Stage, limit: StageLimit) -> Concern:
    cause = f" with divide = {stage.divide}" if stage.divide > 1 else ""
    return Concern(
        severity="error",
        key=_key(stage, limit),
        text=f"The topology {stage.topology}{cause} gives no {limit.quantity} to judge.",
        hint="Take this limit out.",
    )


def _impossible_duty(stage: Stage, limit: StageLimit) -> Concern | None:
    """Say so where an astable is asked for a duty of 50 % or less."""
    charges_longer = stage.topology == "astable" and stage.control_v is None
    if limit.quantity != "duty" or not charges_longer or limit.upper is None or limit.upper > 0.5:
        return None
    return Concern(
        severity="error",
        key=_key(stage, limit),
        text=(
            "An astable charges through RA + RB and discharges through RB alone: its duty is "
            f"always above 50 %, and the limit asks for at most {format_value(limit.upper, '1')}."
        ),
        hint="Use the topology astable-diode, divide the output, or move the limit.",
    )


def _nominal_outside(stage: Stage, limit: StageLimit) -> Concern:
    nominal = limit.nominal or 0.0
    bounds = [
        f"{word} {format_value(value, limit.unit, 5)}"
        for word, value in (("at least", limit.lower), ("at most", limit.upper))
        if value is not None
    ]
    return Concern(
        severity="error",
        key=_key(stage, limit),
        text=(
            f"The nominal parts give {limit.quantity} = {format_value(nominal, limit.unit, 5)}, "
            f"and its limit asks for {' and '.join(bounds)}: a good board fails."
        ),
        hint="Check the part values and the limit against the drawing.",
    )


def _good_boards_outside(stage: Stage, limit: StageLimit, share: float) -> Concern:
    return Concern(
        severity="warning",
        key=_key(stage, limit),
        text=(
            f"About {100 * share:.2g} % of the boards with all parts inside their tolerances lie "
            f"outside the limits on {limit.quantity} ({TRIALS:,} random boards)."
        ),
        hint="Tighten the tolerances or widen the limits; `benchtool design limits` shows what the "
        "tolerances need.",
    )
