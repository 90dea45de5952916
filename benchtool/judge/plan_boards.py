"""Boards with one part replaced: what they would do, and how many would pass."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace
from types import MappingProxyType

import numpy as np

from benchtool.circuits import Coordinate, Value, coordinates
from benchtool.errors import UsageError
from benchtool.frozen import frozen_record
from benchtool.judge.plan_risks import judge_boards
from benchtool.judge.responses import UNITS, respond, respond_nominally
from benchtool.model.arrays import FloatArray
from benchtool.model.design import Design, Part, Stage
from benchtool.model.picking import Candidate, Outlook, Spread
from benchtool.model.plan import PlannedQuantity
from benchtool.model.quantity import Notice
from benchtool.units import format_value

N_BOARDS = 40_000
"""Boards behind a share: its standard error is at most 0.25 %."""

_SEED = 20310305
_REACH = 1e3  # how far from its marked value a part is looked for, as a factor
_GRID = 129


def with_known_parts(stage: Stage, known: Mapping[str, Spread]) -> Stage:
    """Return the stage with parts as they were measured, each with its own range.

    Args:
        stage: A stage.
        known: Reference to what is there.

    Raises:
        UsageError: If the stage has no such part.
    """
    strangers = [ref for ref in known if ref not in stage.parts]
    if strangers:
        raise UsageError(
            f"stage {stage.name} has no part {strangers[0]!r}",
            hint=f"It has {', '.join(stage.parts)}.",
        )
    changed = {ref: _measured(stage.parts[ref], spread) for ref, spread in known.items()}
    return replace(stage, parts=MappingProxyType({**stage.parts, **changed}))


def _measured(part: Part, spread: Spread) -> Part:
    return replace(
        part,
        value=spread.value,
        lower_rel=spread.lower / spread.value - 1,
        upper_rel=spread.upper / spread.value - 1,
    )


def value_for(stage: Stage, design: Design, ref: str, quantity: str, target: float) -> float:
    """Return the value of a part that gives a quantity its target, all else nominal.

    Args:
        stage: A stage of ``design``.
        design: Gives supply, temperature and probe.
        ref: The part.
        quantity: Timing name.
        target: Value wanted, in the quantity's SI unit.

    Returns:
        Ohms or farads, to 12 digits.

    Raises:
        UsageError: If the part or the quantity is not there, or no value of the part gives the
            target (``target-out-of-reach``).
    """
    if ref not in stage.parts:
        raise UsageError(
            f"stage {stage.name} has no part {ref!r}", hint=f"It has {', '.join(stage.parts)}."
        )
    known = respond_nominally(stage, design)
    if quantity not in known:
        raise UsageError(
            f"stage {stage.name} has no {quantity}", hint=f"It has {', '.join(known)}."
        )
    marked = stage.parts[ref].value
    low, high = marked / _REACH, marked * _REACH
    for _ in range(8):  # each narrows the range 128-fold
        values = np.geomspace(low, high, _GRID)
        away = respond(stage, design, {ref: values}, size=_GRID)[quantity] - target
        crossing = np.flatnonzero((np.sign(away[:-1]) * np.sign(away[1:])) <= 0)
        if not crossing.size:
            raise _out_of_reach(ref, quantity, target, away + target)
        at = int(crossing[np.argmin(np.abs(np.log(values[crossing] / marked)))])
        low, high = float(values[at]), float(values[at + 1])
    return math.sqrt(low * high)


def _out_of_reach(ref: str, quantity: str, target: float, reached: FloatArray) -> UsageError:
    unit = UNITS[quantity]
    runs = reached[np.isfinite(reached)]
    ends = [float(end) for end in (runs.min(), runs.max())] if runs.size else []
    between = " to ".join(format_value(end, unit, 3) for end in ends)
    reaches = f"it reaches {between}" if ends else "the circuit stands still"
    return UsageError(
        f"no value of {ref} gives {quantity} = {format_value(target, unit)}: {reaches}",
        hint="Correct the target, or change another part.",
        code="target-out-of-reach",
    )


def tell_outside(
    quantity: str, target: float, planned: Sequence[PlannedQuantity]
) -> tuple[Notice, ...]:
    """Return a warning where a target lies outside the design's own limits.

    Args:
        quantity: Timing name.
        target: Value wanted, in its unit.
        planned: What is judged.
    """
    for item in planned:
        low, high = item.lower, item.upper
        inside = (low is None or target >= low) and (high is None or target <= high)
        if item.quantity == quantity and not inside:
            text = (
                f"the target of {format_value(target, item.unit)} lies outside the design's own "
                f"limits on {quantity}: no board that meets it can pass"
            )
            return (Notice(code="target-outside-limits", text=text),)
    return ()


@frozen_record(eq=False)
class Lot:
    """Random boards, but for one part: the same for every candidate, so that shares compare.

    Attributes:
        stage, design: What they are.
        ref: The part that is left open.
        point: Coordinate to its values.
        place_there, place_added: Where what is there and what is added lie in their ranges, 0 to 1.
    """

    stage: Stage
    design: Design
    ref: str
    point: Mapping[str, Value]
    place_there: FloatArray
    place_added: FloatArray


def draw_lot(stage: Stage, design: Design, ref: str) -> Lot:
    """Draw boards: rectangular parts, normal IC terms, a fixed seed.

    Args:
        stage: A stage of ``design``.
        design: Gives supply, temperature and probe.
        ref: The part that is left open.
    """
    rng = np.random.default_rng(_SEED)
    axes = [axis for axis in coordinates(stage, design) if axis.name != ref]
    return Lot(
        stage=stage,
        design=design,
        ref=ref,
        point={axis.name: _draw(axis, rng) for axis in axes},
        place_there=rng.uniform(size=N_BOARDS),
        place_added=rng.uniform(size=N_BOARDS),
    )


def _draw(axis: Coordinate, rng: np.random.Generator) -> FloatArray:
    if axis.law == "normal":
        return rng.normal(axis.centre, axis.u, N_BOARDS)
    return rng.uniform(axis.lower, axis.upper, N_BOARDS)


Join = Callable[[FloatArray, FloatArray], FloatArray]


def foresee(
    lot: Lot,
    have: Spread,
    candidate: Candidate,
    join: Join | None,
    planned: Sequence[PlannedQuantity],
) -> Outlook:
    """Return what boards with a candidate would do.

    Args:
        lot: The other parts.
        have: What is there.
        candidate: What is done.
        join: Two parts as one; None where the candidate stands alone.
        planned: Limits with the uncertainty to expect of each quantity.
    """
    values = _placed(have, lot.place_there)
    if candidate.added is not None:
        added = _placed(candidate.added, lot.place_added)
        values = added if join is None else join(values, added)
    point = {**lot.point, lot.ref: values}
    rows = respond(lot.stage, lot.design, point, size=N_BOARDS)
    shares = judge_boards(rows, planned)
    nominal = with_known_parts(lot.stage, {lot.ref: candidate.result})
    return Outlook(
        nominal=respond_nominally(nominal, lot.design),
        p_pass=None if shares is None else shares.passing,
    )


def _placed(spread: Spread, place: FloatArray) -> FloatArray:
    placed: FloatArray = spread.lower + (spread.upper - spread.lower) * place
    return placed
