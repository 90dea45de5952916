"""The words of the design file that depend on each other, as data."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from difflib import get_close_matches
from typing import Literal

from benchtool.frozen import frozen_record

SCHEMA = 1
"""The one number that ``schema`` may hold."""

BoundKind = Literal["time", "frequency", "duty", "jitter"]


@frozen_record
class Quantity:
    """A quantity that can be limited.

    Attributes:
        unit: SI unit of its value.
        kind: How its limits are written.
        meaning: A few words for editors.
        example: A limit as the file may have it.
    """

    unit: str
    kind: BoundKind
    meaning: str
    example: object = "25 s 5%"


def _time(meaning: str) -> Quantity:
    return Quantity(unit="s", kind="time", meaning=meaning)


def _jitter(meaning: str) -> Quantity:
    return Quantity(unit="s", kind="jitter", meaning=meaning, example={"upper": "0.2%"})


QUANTITIES: Mapping[str, Quantity] = {
    "t_high": _time("time in the high state; of a one-shot, the pulse"),
    "t_low": _time("time in the low state"),
    "period": _time("from edge to next edge of the same direction"),
    "frequency": Quantity(
        unit="Hz", kind="frequency", meaning="one over the period", example="40 mHz 5%"
    ),
    "duty": Quantity(unit="1", kind="duty", meaning="high time over period", example="53% .. 57%"),
    "first_high": _time("the first high time after power-up"),
    "delay": _time("from power-up to the edge"),
    "tau_charge": _time("R times C of the charging path"),
    "tau_discharge": _time("R times C of the discharging path"),
    "jitter_period": _jitter("standard deviation of the periods"),
    "jitter_cycle": _jitter("rms of the differences of neighbouring periods"),
}
"""Every quantity that can be limited."""

JITTERS = ("jitter_period", "jitter_cycle")
"""Quantities that no part tolerance predicts: they are limited, never derived."""

_OF_CYCLE = ("t_high", "t_low", "period", "frequency", "duty", "first_high")
_OF_PARTS = ("tau_charge", "tau_discharge")
_OSCILLATOR = (*_OF_CYCLE, *_OF_PARTS, *JITTERS)

TOPOLOGY_QUANTITIES: Mapping[str, tuple[str, ...]] = {
    "astable": _OSCILLATOR,
    "astable-diode": _OSCILLATOR,
    "output-fed": _OSCILLATOR,
    "one-shot": ("t_high", *_OF_PARTS),
    "schmitt": _OSCILLATOR,
    "power-on": ("delay", *_OF_PARTS),
}
"""What a stage can be judged on; a one-shot's period, frequency and duty are its trigger's."""

DIVIDED_QUANTITIES = ("period", "frequency", *JITTERS)
"""What keeps a meaning where the output counts several cycles of the circuit."""

USUAL_QUANTITIES: Mapping[str, tuple[str, ...]] = {
    "one-shot": ("t_high",),
    "power-on": ("delay",),
}
"""What ``derive`` judges where ``quantities`` is left out, for the topologies with one time."""

_USUAL_OF_OSCILLATOR = ("t_high", "t_low", "period", "duty")

TOPOLOGY_PARTS: Mapping[str, tuple[str, ...]] = {
    "astable": ("RA", "RB", "C"),
    "astable-diode": ("RA", "RB", "C"),
    "output-fed": ("R", "C"),
    "one-shot": ("R", "C"),
    "schmitt": ("R", "C"),
    "power-on": ("R", "C"),
}
"""The timing parts of each topology."""


@frozen_record
class IcTerm:
    """A term of the IC that a design may state; the two thresholds stand apart.

    Attributes:
        unit: SI unit of its value.
        meaning: A few words for editors.
        example: A value as the file may have it.
    """

    unit: str
    meaning: str
    example: str


IC_TERMS: Mapping[str, IcTerm] = {
    name: IcTerm(unit=unit, meaning=meaning, example=example)
    for name, unit, meaning, example in (
        ("u_threshold", "1", "relative standard uncertainty of the upper threshold", "0.6%"),
        ("u_split", "1", "relative standard uncertainty of lower over upper threshold", "0.4%"),
        ("discharge_saturation", "V", "voltage left across the discharge switch", "37 mV"),
        ("discharge_resistance", "ohm", "resistance of the discharge switch, on", "9.5 ohm"),
        ("discharge_leakage", "A", "current through the discharge switch, off", "20 nA"),
        ("bias_current", "A", "current sunk from the timing node", "30 nA"),
        ("delay_upper", "s", "delay after the upper threshold", "0.16 us"),
        ("delay_lower", "s", "delay after the lower threshold", "0.16 us"),
        ("output_high_drop", "V", "supply minus the output's high level, unloaded", "1.5 V"),
        ("output_high_resistance", "ohm", "resistance of the output, high", "50 ohm"),
        ("output_low", "V", "the output's low level, unloaded", "0.1 V"),
        ("output_low_resistance", "ohm", "resistance of the output, low", "10 ohm"),
    )
}


def usual_quantities(topology: str, divide: int) -> tuple[str, ...]:
    """Return what ``derive`` judges where the design names no quantities."""
    if divide > 1:
        return ("period",)
    return USUAL_QUANTITIES.get(topology, _USUAL_OF_OSCILLATOR)


def nearest(word: str, known: Iterable[str]) -> str | None:
    """Return the known word that looks most like ``word``, whatever its case."""
    folded = {item.casefold(): item for item in known}
    close = get_close_matches(word.casefold(), folded, n=1)
    return folded[close[0]] if close else None


def listed(words: Iterable[str], joint: str = "and") -> str:
    """Return "a, b and c"."""
    *head, last = words
    return f"{', '.join(head)} {joint} {last}" if head else last
