"""Limits that follow from the tolerances of a design, three ways, and those it states."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping

from benchtool.judge.extremes import Extremes, find_corners, find_quantiles, find_root_sums
from benchtool.judge.responses import UNITS, respond_nominally
from benchtool.model.decision import DerivedLimit, LimitComparison, StageLimit
from benchtool.model.design import Derivation, Design, Limit, Stage
from benchtool.model.quantity import Notice
from benchtool.uncertainty import coverage_factor

METHODS: Mapping[Derivation, Callable[[Stage, Design], Extremes]] = {
    "worst-case": find_corners,
    "rss": find_root_sums,
    "monte-carlo": find_quantiles,
}
METHOD_WORDS: Mapping[Derivation, str] = {
    "worst-case": "worst case",
    "rss": "root sum of squares",
    "monte-carlo": "Monte Carlo",
}
_RISING = frozenset(UNITS) - {"frequency", "duty"}


def derive_limits(
    stage: Stage, design: Design, method: Derivation = "worst-case"
) -> tuple[DerivedLimit, ...]:
    """Return what the tolerances allow each quantity to be.

    Everything that may vary on a board takes part: tolerances of the parts, supply and temperature
    range, the capacitor's leakage from 0 to its maximum (half of it nominal) and the spread of the
    IC's terms (±2u where one number stands for a normal law).

    Args:
        stage: A stage of ``design``.
        design: Gives supply, temperature and probe.
        method: ``worst-case`` takes every corner of the ranges; ``rss`` the nominal value ± the
            root sum of squares of half the change over each range; ``monte-carlo`` the 0.135 % and
            99.865 % quantiles of a million boards, rectangular parts and normal IC terms, from a
            fixed seed.

    Returns:
        One limit for each quantity that the stage has. A side is None, with the notice
        ``circuit-may-stop``, where permitted parts stop the circuit.

    References:
        JCGM 101:2008, clause 7, for the propagation of distributions; 0.135 % and 99.865 % are the
        quantiles at ±3 standard deviations of a normal law (ISO 22514-2, from memory).
    """
    nominal = respond_nominally(stage, design)
    extremes = METHODS[method](stage, design)
    notices = _stop_notices(stage, extremes, method)
    return tuple(
        DerivedLimit(
            quantity=name,
            nominal=value,
            lower=_lower(name, extremes, stopped=bool(notices)),
            upper=_upper(name, extremes, stopped=bool(notices)),
            unit=UNITS[name],
            method=method,
            warnings=notices if _can_stop(name) else (),
        )
        for name, value in nominal.items()
    )


def _can_stop(name: str) -> bool:
    """Say whether a quantity ceases to exist where the circuit stops; products never do."""
    return not name.startswith("tau_")


def _lower(name: str, extremes: Extremes, *, stopped: bool) -> float | None:
    """Return the lower limit; a circuit that stops has frequency 0 and any duty."""
    open_side = stopped and _can_stop(name) and name not in _RISING
    return None if open_side else _finite(extremes.ranges[name][0])


def _upper(name: str, extremes: Extremes, *, stopped: bool) -> float | None:
    """Return the upper limit; the times of a circuit that stops have none."""
    open_side = stopped and _can_stop(name) and name != "frequency"
    return None if open_side else _finite(extremes.ranges[name][1])


def _finite(value: float) -> float | None:
    """Return a limit, None where no board runs at all."""
    return value if math.isfinite(value) else None


def _stop_notices(stage: Stage, extremes: Extremes, method: Derivation) -> tuple[Notice, ...]:
    if not extremes.stopped:
        return ()
    return (
        Notice(
            code="circuit-may-stop",
            text=(
                f"stage {stage.name}: parts inside their tolerances can keep the node from its "
                f"threshold ({METHOD_WORDS[method]}: {extremes.stopped}), so nothing limits "
                "how slow a good board may be"
            ),
        ),
    )


def stage_limits(stage: Stage, design: Design) -> tuple[StageLimit, ...]:
    """Return the limits by which a stage is judged.

    Limits that the design states come first and win; each of ``quantities`` without a line of its
    own gets a derived one, by worst case unless the design names another method.

    Args:
        stage: A stage of ``design``.
        design: Gives supply, temperature and probe.
    """
    stated = {limit.quantity for limit in stage.limits}
    wanted = [name for name in stage.quantities if name not in stated]
    method = stage.derive or "worst-case"
    nominal = respond_nominally(stage, design)
    derived = (
        {item.quantity: item for item in derive_limits(stage, design, method)} if wanted else {}
    )
    return (
        *(_given(limit, nominal.get(limit.quantity)) for limit in stage.limits),
        *(_from_derived(derived[name]) for name in wanted if name in derived),
    )


def _given(limit: Limit, nominal: float | None) -> StageLimit:
    return StageLimit(
        quantity=limit.quantity,
        nominal=nominal,
        lower=limit.lower,
        upper=limit.upper,
        unit=limit.unit,
        source=limit.source,
        relative=limit.relative,
    )


def _from_derived(limit: DerivedLimit) -> StageLimit:
    return StageLimit(
        quantity=limit.quantity,
        nominal=limit.nominal,
        lower=limit.lower,
        upper=limit.upper,
        unit=limit.unit,
        source=f"derived: {METHOD_WORDS[limit.method]}",
        warnings=limit.warnings,
    )


def limits_three_ways(
    stage: Stage, design: Design, *, expected_u_rel: float | None = None
) -> tuple[LimitComparison, ...]:
    """Return every quantity's limits by all three methods, beside those that the design states.

    Args:
        stage: A stage of ``design``.
        design: Gives supply, temperature, probe and the rule's coverage.
        expected_u_rel: Relative standard uncertainty to expect of a measured value, 0 or more;
            None leaves the room against U out.
    """
    ways = [
        {item.quantity: item for item in derive_limits(stage, design, method)} for method in METHODS
    ]
    given = {limit.quantity: limit for limit in stage.limits}
    names = [*ways[0], *(name for name in given if name not in ways[0])]
    k_rel = None
    if expected_u_rel is not None:
        k_rel = coverage_factor(float("inf"), design.rule.coverage) * expected_u_rel
    return tuple(
        _compared(name, stage, tuple(way[name] for way in ways if name in way), given, k_rel)
        for name in names
    )


def _compared(
    name: str,
    stage: Stage,
    derived: tuple[DerivedLimit, ...],
    given: Mapping[str, Limit],
    k_rel: float | None,
) -> LimitComparison:
    stated = given.get(name)
    method = stage.derive or "worst-case"
    chosen = next((item for item in derived if item.method == method), None)
    bounds = stated or chosen
    lower, upper = (bounds.lower, bounds.upper) if bounds else (None, None)
    nominal = chosen.nominal if chosen else None
    U = None if k_rel is None or nominal is None else k_rel * nominal
    room = None if not U or lower is None or upper is None else (upper - lower) / (2 * U)
    fallback = method if name in stage.quantities and chosen else None
    return LimitComparison(
        quantity=name,
        nominal=nominal,
        unit=bounds.unit if bounds else "",
        derived=derived,
        given=stated,
        used="given" if stated else fallback,
        lower=lower,
        upper=upper,
        U=U,
        room=room,
        warnings=tuple(
            {notice.code: notice for item in derived for notice in item.warnings}.values()
        ),
    )
