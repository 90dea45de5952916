"""A board without a drawing: a design made of its markings, with what is assumed of the rest."""

from __future__ import annotations

from typing import Any

from benchtool.designs import NewDesign, parse_design, write_design
from benchtool.designs.vocabulary import TOPOLOGY_PARTS
from benchtool.errors import UsageError
from benchtool.model.design import Design
from benchtool.model.quantity import Notice

_R_TOLERANCE, _C_TOLERANCE = "5%", "20%"
"""Of parts whose marking is given without one: common practice."""
_SUPPLY = "12 V 10%"


def undrawn_design(given: dict[str, Any]) -> tuple[Design, tuple[Notice, ...]]:
    """Return a design made of markings, and what was assumed for it.

    Args:
        given: ``topology``, ``RA``, ``RB``, ``R``, ``C``, ``ic`` and ``supply_nominal`` as texts.

    Raises:
        UsageError: If a part is missing.
        DesignError: If a value is none.
    """
    refs = TOPOLOGY_PARTS[given["topology"]]
    missing = [ref for ref in refs if given[ref] is None]
    if missing:
        raise UsageError(
            f"{given['topology']} needs {' and '.join(missing)} as marked",
            hint=f"Give --{missing[0]}; with no markings at all: benchtool solve FILE --topology.",
        )
    parts = {ref: _with_tolerance(ref, given[ref]) for ref in refs}
    answers = NewDesign(
        name="Board without a drawing",
        topology=given["topology"],
        parts=parts,
        supply=given["supply_nominal"] or _SUPPLY,
        ic=given["ic"] or "cmos",
    )
    design = parse_design(write_design(answers), source="")
    return design, tuple(_assumed(given, parts))


def _with_tolerance(ref: str, text: str) -> str:
    if "%" in text:
        return text
    return f"{text} {_C_TOLERANCE if ref == 'C' else _R_TOLERANCE}"


def _assumed(given: dict[str, Any], parts: dict[str, str]) -> list[Notice]:
    said = [f"{ref} {text}" for ref, text in parts.items() if text != given[ref]]
    if given["ic"] is None:
        said.append("a CMOS timer")
    if given["supply_nominal"] is None:
        said.append(f"a supply of {_SUPPLY}")
    if not said:
        return []
    text = f"taken for granted, since there is no drawing: {', '.join(said)}"
    return [Notice(code="assumed-from-markings", text=text)]
