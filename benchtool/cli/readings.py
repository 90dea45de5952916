"""What a technician writes of his readings: ``control-pin=7.95V``, ``RB<=46.8k``, ``C=8.1u``."""

from __future__ import annotations

import re

from benchtool.cli.options import value_of
from benchtool.errors import UsageError
from benchtool.frozen import frozen_record
from benchtool.model.diagnosis import PartWay, Reading, ReadingKind
from benchtool.units import format_value

_PARTS = {"RA": "ohm", "RB": "ohm", "R": "ohm", "C": "F"}
_TYPED = re.compile(
    r"(?P<name>[A-Za-z-]+)\s*(?P<sign><=|>=|=|≤|≥)\s*(?P<value>.+?)\s*(?:(?:±|\+-)\s*(?P<u>.+))?"
)
_WAYS: dict[str, PartWay] = {
    "=": "isolated",
    "<=": "at-most",
    ">=": "at-least",
    "≤": "at-most",
    "≥": "at-least",
}


@frozen_record
class _Sort:
    """A sort of reading: its unit, and U at 95 % where the user states none (assumed).

    Attributes:
        kind: What it is of.
        unit: Its unit.
        U_rel, U_abs: Half-width as a share, and in the unit.
        lower, upper: Outside of these it is a slip of the pen.
    """

    kind: ReadingKind
    unit: str
    U_rel: float = 0.0
    U_abs: float = 0.0
    lower: float = -1.0
    upper: float = 100.0


_SORTS = {
    "control-pin": _Sort(kind="control-pin", unit="V", U_rel=0.006, lower=1e-3),
    "supply": _Sort(kind="supply", unit="V", U_rel=0.006, lower=0.1),
    "discharge-pin": _Sort(kind="discharge-pin", unit="V", U_rel=0.02, U_abs=2e-3),
    "output-high": _Sort(kind="output-high", unit="V", U_rel=0.006),
    "output-low": _Sort(kind="output-low", unit="V", U_rel=0.02, U_abs=2e-3),
    "node-level": _Sort(kind="node-level", unit="V", U_rel=0.01, U_abs=5e-3),
    "temperature": _Sort(kind="temperature", unit="degC", U_abs=2.0, lower=-60.0, upper=200.0),
    **{
        ref: _Sort(kind="part", unit="ohm", U_rel=0.01, lower=1e-3, upper=1e12)
        for ref in ("RA", "RB", "R")
    },
    "C": _Sort(kind="part", unit="F", U_rel=0.02, lower=1e-13, upper=1.0),
}
"""Half-widths that a handheld meter keeps: common practice; one that is stated wins."""


def _refuse_impossible(option: str, value: float, sort: _Sort) -> None:
    if not sort.lower <= value <= sort.upper:
        ends = " to ".join(format_value(end, sort.unit) for end in (sort.lower, sort.upper))
        raise UsageError(
            f"{option}={format_value(value, sort.unit)} cannot be: {ends} can",
            hint="Check the figure, its unit and its sign.",
        )


def reading_of(text: str) -> Reading:
    """Return the reading that a text states.

    Args:
        text: A name, a sign and a value, with ``±`` and its U at 95 % where known.

    Raises:
        UsageError: If it is none; the message says why.
    """
    typed = _TYPED.fullmatch(text.strip())
    sort = _SORTS.get(typed["name"]) if typed else None
    if typed is None or sort is None:
        raise UsageError(
            f"--reading wants a name, a sign and a value, got {text!r}",
            hint=f'Such as --reading control-pin=7.95V or "RB<=46.8k"; names: {", ".join(_SORTS)}.',
        )
    way = _WAYS[typed["sign"]]
    if way != "isolated" and sort.kind != "part":
        raise UsageError(
            f"--reading {text}: only a part measured in the circuit gives a bound",
            hint=f"Write {typed['name']}={typed['value']}.",
        )
    option = f"--reading {typed['name']}"
    value = value_of(option, typed["value"], sort.unit) or 0.0
    _refuse_impossible(option, value, sort)
    stated = value_of(option, typed["u"], sort.unit) if typed["u"] else None
    if stated is not None and stated <= 0:
        raise UsageError(
            f"{option}: its U must be greater than 0", hint="Leave it out, or state it."
        )
    half = stated if stated is not None else abs(value) * sort.U_rel + sort.U_abs
    return Reading(
        kind=sort.kind,
        value=value,
        u=max(half, 1e-30) / 1.96,
        unit=sort.unit,
        part=typed["name"] if typed["name"] in _PARTS else None,
        way=way,
    )
