"""What to fit to come near a value: another part, one across what is there, or one in series."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Mapping, Sequence
from types import MappingProxyType
from typing import TypeVar

from benchtool.model.arrays import FloatArray
from benchtool.model.picking import Action, Candidate, Offer, PartKind, Spread
from benchtool.parts.series import neighbours

Value = TypeVar("Value", float, FloatArray)

SERIES_TOLERANCES: Mapping[str, float] = MappingProxyType(
    {"E3": 0.4, "E6": 0.2, "E12": 0.1, "E24": 0.05, "E48": 0.02, "E96": 0.01, "E192": 0.005}
)
"""Tolerance that goes with each series: IEC 60063, from memory."""

USUAL_SERIES: Mapping[PartKind, tuple[str, ...]] = MappingProxyType(
    {"resistor": ("E12", "E24", "E96"), "capacitor": ("E6", "E12"), "electrolytic": ("E6",)}
)
"""Series that are in a drawer: common practice."""

_TRIM_RANGE: Mapping[PartKind, tuple[float, float]] = MappingProxyType(
    {"resistor": (1.0, 22e6), "capacitor": (10e-12, 1e-3)}
)
"""Values worth fitting: beyond them leads, board and fingers do as much (common practice)."""

_NOTABLE = 0.05  # share of boards from which one candidate is better than another that is nearer
_LARGEST = 0.5  # change that is still a trim: beyond it the added part sets the value
_DIFFERS = 1e-9  # relative, from which what is there is not what is wanted
_FEWER_PARTS: Mapping[Action, int] = MappingProxyType(
    {"keep": 0, "replace": 1, "parallel": 2, "series": 2}
)


def spread_of(value: float, lower_rel: float, upper_rel: float) -> Spread:
    """Return a part with its tolerance as two relative deviations, lower_rel <= 0 <= upper_rel."""
    return Spread(value=value, lower=value * (1 + lower_rel), upper=value * (1 + upper_rel))


def join(first: Value, second: Value, *, adds: bool) -> Value:
    """Return two parts as one.

    Args:
        first: Value of one part, any unit.
        second: Value of the other, same unit.
        adds: Whether values add (resistors in series, capacitors in parallel) or their inverses do.
    """
    return first + second if adds else first * second / (first + second)


def adds_up(kind: PartKind, action: Action) -> bool:
    """Return whether values add: resistors in series, capacitors in parallel."""
    return (action == "series") is (kind == "resistor")


def list_candidates(
    have: Spread,
    wanted: float,
    kind: PartKind,
    *,
    series: Sequence[str],
    tolerances_rel: Mapping[str, tuple[float, float]],
) -> tuple[Candidate, ...]:
    """Return what could be fitted to come near a value, the best first.

    What is there may stay, be replaced by a preferred value next to the one wanted, or be trimmed:
    a resistor that reads high by one across it, one that reads low by one in series; a capacitor
    the other way round. Electrolytics are not trimmed.

    Args:
        have: What is there.
        wanted: Value wanted, ohms or farads, above 0.
        kind: What the part is.
        series: E-series to choose from.
        tolerances_rel: Series to lower and upper tolerance of a part bought in it.

    Returns:
        Ranked by the root mean square distance from ``wanted``: off by its nominal value and by
        its spread together.

    Example:
        >>> have = spread_of(346e3, -0.005, 0.005)
        >>> best = list_candidates(
        ...     have, 330e3, "resistor", series=["E24"], tolerances_rel={"E24": (-0.05, 0.05)}
        ... )[0]
        >>> best.action, best.added.value, round(best.result.value)
        ('parallel', 7500000.0, 330742)
    """
    found = [_candidate("keep", None, None, have, have.u, wanted)]
    found += _replacements(wanted, series, tolerances_rel)
    if kind != "electrolytic":
        found += _trims(have, wanted, kind, series, tolerances_rel)
    return tuple(sorted(_each_once(found), key=lambda item: rank(item, wanted)))


def rank(candidate: Candidate, wanted: float) -> tuple[float, int]:
    """Return the key that sorts candidates: root mean square distance, then fewer parts."""
    return (
        math.hypot(candidate.result.value - wanted, candidate.u) / wanted,
        _FEWER_PARTS[candidate.action],
    )


def order_offers(offers: Sequence[Offer], *, has_moved: bool, by_share: bool) -> tuple[Offer, ...]:
    """Return offers with the most passing boards first, in steps of 5 %, else as they stand.

    Args:
        offers: In the order of their candidates.
        has_moved: Whether what is there is outside its own tolerance: of equals, what replaces it
            then comes before what keeps it.
        by_share: Whether the share counts: not where the target itself lies outside the limits.
    """

    def key(offer: Offer) -> tuple[int, bool]:
        keeps = offer.candidate.action != "replace"
        return -round(_passing(offer) / _NOTABLE) * by_share, has_moved and keeps

    return tuple(sorted(offers, key=key))


def _passing(offer: Offer) -> float:
    return (offer.outlook.p_pass or 0.0) if offer.outlook else 0.0


def _each_once(candidates: Sequence[Candidate]) -> list[Candidate]:
    """Return each action and value once, of the series whose parts are the closest."""
    best: dict[tuple[Action, float | None], Candidate] = {}
    for item in candidates:
        key = item.action, item.added.value if item.added else None
        if key not in best or item.u < best[key].u:
            best[key] = item
    return list(best.values())


def _candidate(
    action: Action,
    added: Spread | None,
    series: str | None,
    result: Spread,
    u: float,
    wanted: float,
) -> Candidate:
    return Candidate(
        action=action,
        added=added,
        series=series,
        result=result,
        u=u,
        off_rel=result.value / wanted - 1,
    )


def _replacements(
    wanted: float, series: Sequence[str], tolerances_rel: Mapping[str, tuple[float, float]]
) -> Iterator[Candidate]:
    for name in series:
        for value in dict.fromkeys(neighbours(wanted, name)):
            part = spread_of(value, *tolerances_rel[name])
            yield _candidate("replace", part, name, part, part.u, wanted)


def _trims(
    have: Spread,
    wanted: float,
    kind: PartKind,
    series: Sequence[str],
    tolerances_rel: Mapping[str, tuple[float, float]],
) -> Iterator[Candidate]:
    if not _DIFFERS <= abs(have.value / wanted - 1) <= _LARGEST:
        return
    adds = wanted > have.value
    action: Action = "series" if adds is (kind == "resistor") else "parallel"
    exact = wanted - have.value if adds else 1 / (1 / wanted - 1 / have.value)
    least, most = _TRIM_RANGE[kind]
    for name in series:
        for value in dict.fromkeys(neighbours(exact, name)):
            if least <= value <= most:
                added = spread_of(value, *tolerances_rel[name])
                yield _trimmed(action, have, added, name, wanted, adds=adds)


def _trimmed(
    action: Action, have: Spread, added: Spread, series: str, wanted: float, *, adds: bool
) -> Candidate:
    def together(pick: Callable[[Spread], float]) -> float:
        return join(pick(have), pick(added), adds=adds)

    value = together(lambda part: part.value)
    result = Spread(
        value=value,
        lower=together(lambda part: part.lower),
        upper=together(lambda part: part.upper),
    )
    weights = (1.0, 1.0) if adds else ((value / have.value) ** 2, (value / added.value) ** 2)
    u = math.hypot(weights[0] * have.u, weights[1] * added.u)
    return _candidate(action, added, series, result, u, wanted)
