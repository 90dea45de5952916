"""What to know before a part is changed or trimmed: causes that it would hide, ratings."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from benchtool.frozen import frozen_record
from benchtool.model.design import Part
from benchtool.model.picking import PartKind, Spread
from benchtool.model.quantity import Notice
from benchtool.units import format_value

LIVE_SUSPECT = 0.05
"""Probability from which a suspect cannot be excluded."""

_FEW = 0.1  # change below which a tenth of a percent is shown

HIDDEN_CAUSES: Mapping[str, str] = {
    "C-leaky": "a leaky capacitor",
    "C-esr": "a drying capacitor",
    "node-leak-to-supply": "a leak at the timing node",
    "discharge-leak": "a leaking discharge switch",
    "probe-load": "a probe that loads the node",
}
"""Faults that a trim would cover and that go on growing or vanish with their cause."""


@frozen_record
class Seen:
    """What a diagnosis said of the board.

    Attributes:
        suspects: Fault to its probability.
        findings: Codes of what was seen in the trace.
    """

    suspects: Mapping[str, float]
    findings: tuple[str, ...] = ()


def tell_causes(
    name: str,
    have: Spread,
    wanted: float,
    tolerance_rel: tuple[float, float] | None,
    seen: Seen | None,
) -> Iterator[Notice]:
    """Yield what a change of this part could hide.

    Args:
        name: The part as a sentence calls it: "RB", "this resistor".
        have: What is there.
        wanted: The value wanted.
        tolerance_rel: The part's own tolerance, None where it is not known.
        seen: What a diagnosis said; None where there was none.
    """
    change = wanted / have.value - 1
    if tolerance_rel is not None and not tolerance_rel[0] <= change <= tolerance_rel[1]:
        allowed = format_value(max(-tolerance_rel[0], tolerance_rel[1]), "1", 2)
        percent = f"{100 * change:+.{1 if abs(change) < _FEW else 0}f} %"
        yield Notice(
            code="trim-beyond-tolerance",
            text=f"the change of {percent} is more than the {allowed} that {name} may be off by "
            "itself: something on the board has moved, and a trim would hide it",
        )
    if seen is None:
        yield Notice(
            code="find-the-cause-first",
            text="find the cause before you trim: a leaky capacitor or a drifting part goes on "
            "moving, and the trimmed board will be wrong again",
        )
        return
    hidden = list(_hidden(seen))
    if hidden:
        yield Notice(
            code="trim-would-hide-a-leak",
            text=f"the diagnosis does not exclude {_listed(hidden)}: a trim would hide it and the "
            "board would be wrong again; settle that first",
        )


def moved_by(have: Spread, part: Part) -> float | None:
    """Return how far a measured part is off its marking, None inside its tolerance.

    Args:
        have: The part as measured.
        part: The part as drawn.
    """
    away = have.value / part.value - 1
    inside = have.upper >= part.value * (1 + part.lower_rel) and have.lower <= part.value * (
        1 + part.upper_rel
    )
    return None if inside else away


def _hidden(seen: Seen) -> Iterator[str]:
    for fault, words in HIDDEN_CAUSES.items():
        probability = seen.suspects.get(fault, 0.0)
        if probability >= LIVE_SUSPECT:
            yield f"{words} ({fault}, {100 * probability:.0f} %)"
    if "drifting" in seen.findings:
        yield "a drifting part (the periods drift)"


def _listed(words: list[str]) -> str:
    return words[0] if len(words) == 1 else f"{', '.join(words[:-1])} or {words[-1]}"


def tell_no_trim() -> Notice:
    """Return why an electrolytic is replaced and never trimmed."""
    return Notice(
        code="electrolytic-not-trimmed",
        text="an electrolytic is replaced and not trimmed: its value moves more with age and "
        "warmth than a trim would put right, and one that is off is likely on its way out",
    )


def list_checks(kind: PartKind, supply_v: float | None, smallest_ohm: float | None) -> list[str]:
    """Return what to check before fitting, one sentence each.

    Args:
        kind: What the part is.
        supply_v: Highest supply, volts; None where it is not known.
        smallest_ohm: Smallest resistor that is proposed; None for capacitors.
    """
    if kind == "resistor":
        return [_power(supply_v, smallest_ohm), "Working voltage of the resistor, high ohms most."]
    least = "the supply" if supply_v is None else f"the supply of {format_value(supply_v, 'V', 3)}"
    checks = [f"Voltage rating: at least {least}."]
    if kind == "electrolytic":
        return [*checks, "Polarity, leakage and temperature rating."]
    return [*checks, "Capacitors in series share the voltage: the smaller one takes more of it."]


def _power(supply_v: float | None, smallest_ohm: float | None) -> str:
    if supply_v is None or smallest_ohm is None:
        return "Power rating: voltage squared over the resistance."
    most_w = supply_v**2 / smallest_ohm
    return (
        f"Power rating: no resistor here takes more than {1000 * most_w:.2g} mW "
        "(supply squared over the smallest)."
    )
