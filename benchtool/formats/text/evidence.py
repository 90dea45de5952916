"""What was found about a text's structure, each point with its evidence."""

from __future__ import annotations

from collections.abc import Sequence

from benchtool.formats.text.layout import delimiter_name
from benchtool.formats.text.scanning import Scan
from benchtool.formats.text.structure import Structure
from benchtool.formats.text.timeunit import FoundUnit
from benchtool.model.capture import StructurePoint, Sureness

_Point = tuple[str, str, str, Sureness]

_KINDS = {
    "samples": "one row a sample",
    "transitions": "the rows are unevenly spaced and change the state",
}


def structure_points(
    structure: Structure, scan: Scan, *, kind: str, interval: tuple[str, str] | None
) -> tuple[StructurePoint, ...]:
    """Return the points of a structure.

    Args:
        structure: What was found from head and tail.
        scan: The first walk.
        kind: ``samples`` or ``transitions``.
        interval: Sample interval as shown, and its evidence.
    """
    layout, named = structure.layout, structure.heading.is_named
    titles = ", ".join(column.title for column in structure.columns.values)
    points: list[_Point] = [
        ("encoding", structure.encoding.name, structure.encoding.evidence, "measured"),
        ("delimiter", delimiter_name(layout.delimiter), layout.evidence, "measured"),
        ("decimal", layout.decimal, _decimal_evidence(structure), "measured"),
        ("header", _header_value(structure), _header_evidence(structure), "measured"),
        *_clock_points(structure),
        ("kind", kind, _KINDS[kind], "measured"),
        *_interval_points(structure, interval),
        ("channels", titles, "columns of numbers", "stated" if named else "measured"),
        ("rows", str(scan.n_rows), f"from line {structure.rows.first_line}", "measured"),
    ]
    if scan.n_footer:
        points.append(("footer", f"{scan.n_footer} lines", "text after the last row", "measured"))
    return tuple(StructurePoint(name=n, value=v, evidence=e, sure=s) for n, v, e, s in points)


def _interval_points(structure: Structure, interval: tuple[str, str] | None) -> list[_Point]:
    if interval is None:
        return []
    return [("interval", *interval, _interval_sureness(structure, interval[1]))]


def _interval_sureness(structure: Structure, evidence: str) -> Sureness:
    """Say how sure an interval is: without a clock, as sure as the statement of it."""
    if structure.columns.clocks:
        return "stated" if evidence.startswith("stated") else "measured"
    return "assumed" if structure.stated and structure.stated.assumed_unit else "stated"


def _decimal_evidence(structure: Structure) -> str:
    mark = structure.layout.decimal
    for row in structure.layout.rows:
        for i in structure.layout.fields:
            if mark in row[i]:
                return f"as in {row[i]!r}"
    return "no number has a fraction"


def _header_value(structure: Structure) -> str:
    n_rows = len(structure.heading.rows)
    return {0: "none", 1: "1 row"}.get(n_rows, f"{n_rows} rows")


def _header_evidence(structure: Structure) -> str:
    rows: Sequence[int] = structure.heading.rows
    if not rows:
        return "the line before the first row names no columns"
    return f"line {rows[0] + 1}" if len(rows) == 1 else f"lines {rows[0] + 1} to {rows[-1] + 1}"


def _clock_points(structure: Structure) -> list[_Point]:
    clocks = structure.columns.clocks
    if not clocks:
        return [("time", "none", "no column gives time; rows are counted", "measured")]
    titles = ", ".join(clock.column.title for clock in clocks)
    unit, evidence = structure.units[0], clocks[0].evidence
    return [
        ("time", titles, evidence, "stated" if _is_told(evidence) else "measured"),
        ("time_unit", unit.unit.name, unit.evidence, _unit_sureness(unit)),
    ]


def _unit_sureness(unit: FoundUnit) -> Sureness:
    if unit.warnings:
        return "assumed"
    return "stated" if _is_told(unit.evidence) else "measured"


def _is_told(evidence: str) -> bool:
    """Say whether evidence is words of the file or an option of the user."""
    return evidence.startswith(("header", "metadata", "--"))
