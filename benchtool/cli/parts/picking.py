"""What ``parts pick`` was asked, read from its options and handed on."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from benchtool.cli.parts.texts import kind_of, known_parts, spread_from_text, target_of
from benchtool.errors import UsageError
from benchtool.frozen import frozen_record
from benchtool.model.picking import Offer, PartKind, Picked, Spread
from benchtool.model.quantity import Notice

if TYPE_CHECKING:
    from benchtool.model.design import Design, Part, Stage
    from benchtool.model.picking import Candidate
    from benchtool.model.plan import PlannedQuantity
    from benchtool.parts.picking_cautions import Seen

_UNITS: Mapping[str, str] = {"resistor": "ohm", "capacitor": "F", "electrolytic": "F"}
_LAST_DIGIT = Notice(
    code="assumed-last-digit",
    text="a value without a tolerance is taken to be good to its last digit and no better",
)


@frozen_record
class Wish:
    """What is asked of the parts to fit.

    Attributes:
        series: E-series to choose from; empty for the usual ones.
        tolerance_rel: Half-width of their tolerance; None takes the usual one.
        kind: What the part is, None where its value or the design says.
        seen: What a diagnosis said of the board.
    """

    series: tuple[str, ...]
    tolerance_rel: float | None
    kind: PartKind | None
    seen: Seen | None


def pick_plainly(text: str, wanted: str, wish: Wish) -> Picked:
    """Return what brings a part from one value to another.

    Raises:
        UsageError: If the values are of no part, or of different ones (``which-kind``).
    """
    from benchtool.parts.picking import list_candidates
    from benchtool.parts.picking_cautions import list_checks, tell_causes

    kind = wish.kind or kind_of(text)
    if wish.kind is None and kind_of(wanted) != kind:
        raise UsageError(
            f"{text} and {wanted} are values of different kinds of parts",
            hint="Correct one of them, or say what the part is with --kind.",
            code="which-kind",
        )
    unit = _UNITS[kind]
    have, by_digit = spread_from_text("VALUE", text, unit)
    target, _ = spread_from_text("--to", wanted, unit)
    series, tolerances, assumed = _tolerances(kind, wish, None)
    candidates = list_candidates(have, target.value, kind, series=series, tolerances_rel=tolerances)
    own = tolerances[series[0]]
    causes = tell_causes(f"this {kind}", have, target.value, own, wish.seen)
    return Picked(
        ref="",
        kind=kind,
        unit=unit,
        have=have,
        how="as given",
        wanted=target.value,
        aim=None,
        offers=tuple(Offer(candidate=item) for item in candidates),
        n_boards=0,
        checks=tuple(list_checks(kind, None, None)),
        warnings=(*causes, *_more(kind, by_digit=by_digit, assumed=assumed)),
    )


def _more(kind: PartKind, *, by_digit: bool, assumed: Notice | None) -> list[Notice]:
    from benchtool.parts.picking_cautions import tell_no_trim

    notices = [tell_no_trim()] if kind == "electrolytic" else []
    notices += [_LAST_DIGIT] if by_digit else []
    return [*notices, assumed] if assumed else notices


def _tolerances(
    kind: PartKind, wish: Wish, part: Part | None
) -> tuple[tuple[str, ...], dict[str, tuple[float, float]], Notice | None]:
    """Return the series, the tolerance of parts bought in each, and what was assumed for that."""
    from benchtool.parts.picking import SERIES_TOLERANCES, USUAL_SERIES
    from benchtool.units import format_value

    series = wish.series or USUAL_SERIES[kind]
    if wish.tolerance_rel is not None:
        return series, dict.fromkeys(series, (-wish.tolerance_rel, wish.tolerance_rel)), None
    if part is not None and part.upper_rel > part.lower_rel:
        return series, dict.fromkeys(series, (part.lower_rel, part.upper_rel)), None
    usual = {name: (-SERIES_TOLERANCES[name], SERIES_TOLERANCES[name]) for name in series}
    said = ", ".join(f"{name} {format_value(usual[name][1], '1', 2)}" for name in series)
    text = f"no tolerance was given: that of the series was taken ({said})"
    return series, usual, Notice(code="assumed-part-tolerance", text=text)


def pick_for_board(given: Mapping[str, Any], wish: Wish) -> Picked:
    """Return what brings a quantity of a designed stage to its target.

    Args:
        given: Options ``design``, ``stage``, ``part``, ``target``, ``have``.
        wish: What is asked of the parts to fit.

    Raises:
        UsageError: If an option does not fit the design, or the target cannot be reached.
        DesignError: As ``load_design``.
    """
    from benchtool.designs import load_design
    from benchtool.judge.plan import plan_stage
    from benchtool.judge.plan_boards import N_BOARDS, tell_outside, value_for, with_known_parts
    from benchtool.parts.picking import list_candidates, order_offers, spread_of
    from benchtool.parts.picking_cautions import moved_by

    design = load_design(given["design"])
    stage, ref = _one_stage(design, given["stage"]), str(given["part"])
    known, by_digit = known_parts(stage, given["have"])
    others = {name: spread for name, spread in known.items() if name != ref}
    board = with_known_parts(stage, others)
    quantity, target = target_of(given["target"])
    wanted = value_for(board, design, ref, quantity, target)
    part = stage.parts[ref]
    kind = _kind_in(stage, ref, wish)
    have = known.get(ref) or spread_of(part.value, part.lower_rel, part.upper_rel)
    series, tolerances, assumed = _tolerances(kind, wish, part)
    candidates = list_candidates(have, wanted, kind, series=series, tolerances_rel=tolerances)
    moved_rel = moved_by(have, part) if ref in known else None
    planned = [
        item
        for item in plan_stage(stage, design).quantities
        if (item.lower, item.upper) != (None, None)
    ]
    outside = tell_outside(quantity, target, planned)
    return Picked(
        ref=ref,
        kind=kind,
        unit=_UNITS[kind],
        have=have,
        how="as measured" if ref in known else "as marked",
        wanted=wanted,
        aim=(quantity, target),
        moved_rel=moved_rel,
        offers=order_offers(
            _foreseen(board, design, ref, have, candidates, planned),
            has_moved=moved_rel is not None,
            by_share=not outside,
        ),
        n_boards=N_BOARDS,
        checks=_checks(design, kind, candidates),
        warnings=(
            *outside,
            *_causes(part, have, wanted, wish),
            *_more(kind, by_digit=by_digit, assumed=assumed),
        ),
    )


def _one_stage(design: Design, name: str | None) -> Stage:
    from benchtool.targets import choose_stages

    stages = choose_stages(design, name)
    if len(stages) > 1:
        names = ", ".join(stage.name for stage in stages)
        raise UsageError(
            f"{design.source} has {len(stages)} stages", hint=f"Give --stage: {names}."
        )
    return stages[0]


def _kind_in(stage: Stage, ref: str, wish: Wish) -> PartKind:
    if ref != "C":
        return "resistor"
    if wish.kind in ("capacitor", "electrolytic"):
        return wish.kind
    return "electrolytic" if stage.parts[ref].kind == "electrolytic" else "capacitor"


def _foreseen(
    board: Stage,
    design: Design,
    ref: str,
    have: Spread,
    candidates: tuple[Candidate, ...],
    planned: list[PlannedQuantity],
) -> tuple[Offer, ...]:
    from functools import partial

    from benchtool.judge.plan_boards import draw_lot, foresee
    from benchtool.parts.picking import adds_up, join

    lot = draw_lot(board, design, ref)
    kind: PartKind = "capacitor" if ref == "C" else "resistor"
    offers = []
    for item in candidates:
        alone = item.action in ("keep", "replace")
        joining = None if alone else partial(join, adds=adds_up(kind, item.action))
        outlook = foresee(lot, have, item, joining, planned)
        offers.append(Offer(candidate=item, outlook=outlook))
    return tuple(offers)


def _checks(design: Design, kind: PartKind, candidates: tuple[Candidate, ...]) -> tuple[str, ...]:
    from benchtool.parts.picking_cautions import list_checks

    smallest = min((item.added.value for item in candidates if item.added), default=None)
    return tuple(list_checks(kind, design.supply.upper, smallest))


def _causes(part: Part, have: Spread, wanted: float, wish: Wish) -> tuple[Notice, ...]:
    from benchtool.parts.picking_cautions import tell_causes

    own = (part.lower_rel, part.upper_rel) if part.upper_rel > part.lower_rel else None
    return tuple(tell_causes(part.ref, have, wanted, own, wish.seen))
