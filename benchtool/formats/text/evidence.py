"""What was found about a text's structure, each point with its evidence."""

from __future__ import annotations

from collections.abc import Sequence

from benchtool.formats.text.scanning import Scan
from benchtool.formats.text.structure import Structure
from benchtool.model.capture import StructurePoint

_SHOWN = {"\t": "tab", " ": "space", "": "none"}


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
    layout = structure.layout
    points = [
        ("encoding", structure.encoding.name, structure.encoding.evidence),
        ("delimiter", _SHOWN.get(layout.delimiter, layout.delimiter), layout.evidence),
        ("decimal", layout.decimal, _decimal_evidence(structure)),
        ("header", _header_value(structure), _header_evidence(structure)),
        *_clock_points(structure),
        ("kind", kind, _KINDS[kind]),
        *([("interval", *interval)] if interval else []),
        ("channels", ", ".join(c.title for c in structure.columns.values), "columns of numbers"),
        ("rows", str(scan.n_rows), f"from line {structure.rows.first_line}"),
    ]
    if scan.n_footer:
        points.append(("footer", f"{scan.n_footer} lines", "text after the last row"))
    return tuple(StructurePoint(name=n, value=v, evidence=e) for n, v, e in points)


_KINDS = {
    "samples": "one row a sample",
    "transitions": "the rows are unevenly spaced and change the state",
}


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


def _clock_points(structure: Structure) -> list[tuple[str, str, str]]:
    clocks = structure.columns.clocks
    if not clocks:
        return [("time", "none", "no column gives time; rows are counted")]
    titles = ", ".join(clock.column.title for clock in clocks)
    unit = structure.units[0]
    return [
        ("time", titles, clocks[0].evidence),
        ("time_unit", unit.unit.name, unit.evidence),
    ]
