"""Readings of a text that do equally well: settle them, or refuse the file."""

from __future__ import annotations

import re
from collections import Counter

from benchtool.errors import AmbiguousStructureError, Way
from benchtool.formats.text.cells import is_grouped, kind_of
from benchtool.formats.text.layout import COMMENT, Layout, delimiter_name
from benchtool.model.capture import ReadOptions

_FEW = 3  # lines that are damage and no mark of their own
_MARKS = {".": "point", ",": "comma"}
_THOUSAND = r"[1-9]\d{0,2}\.\d{3}"


def single_best(found: list[tuple[int, Layout]], options: ReadOptions, source: str) -> Layout:
    """Return the layout with most rows, refusing where two do equally well."""
    top = found[0][0]
    rivals = [layout for n, layout in found if n == top]
    best = rivals[0]
    for other in rivals[1:]:
        best = _settle(best, other, source)
    return _checked_groups(best, options, source)


def _settle(a: Layout, b: Layout, source: str) -> Layout:
    if a.delimiter == b.delimiter:
        if _same_numbers(a) or not _all_grouped(a):
            return a if _same_numbers(a) else _by_decimal(a, b)
        raise _ambiguous_groups(a, source)
    if 1 in (a.n_fields, b.n_fields) and a.n_fields != b.n_fields:
        return max(a, b, key=lambda layout: layout.n_fields)  # one column has no delimiter
    if "" in (a.delimiter, b.delimiter):
        none, some = (b, a) if a.delimiter else (a, b)
        return none if some.n_fields == 1 else some  # a decimal comma is looked for after this
    names = " or ".join(repr(layout.delimiter or "none") for layout in (a, b))
    raise AmbiguousStructureError(
        f"the lines of {source} fall into columns under more than one reading "
        f"(delimiter {names}, decimal mark {a.decimal!r} or {b.decimal!r})",
        hint="Say which with --delimiter and --decimal.",
        ways=tuple(
            _way(each.delimiter, each.decimal, f"{each.n_fields} columns") for each in (a, b)
        ),
    )


def _way(delimiter: str, decimal: str, meaning: str) -> Way:
    named = delimiter_name(delimiter)
    return Way(options=(("delimiter", named), ("decimal", decimal)), meaning=meaning)


def _by_decimal(a: Layout, b: Layout) -> Layout:
    """Of a point and a comma reading of the same cells, take the one with fewer groups."""
    point, comma = (a, b) if a.decimal == "." else (b, a)
    has_comma = any("," in row[i] for row in point.rows for i in point.fields)
    return comma if has_comma and not _mixed_groups(point) else point


def _mixed_groups(layout: Layout) -> bool:
    """Say whether some cell has both marks, comma first: the comma groups thousands."""
    cells = (row[i] for row in layout.rows for i in layout.fields)
    return any(0 <= cell.find(",") < cell.find(".") for cell in cells)


def _same_numbers(layout: Layout) -> bool:
    """Say whether no number has a mark, so that both readings are the same."""
    return not any("," in row[i] or "." in row[i] for row in layout.rows for i in layout.fields)


def _all_grouped(layout: Layout) -> bool:
    cells = [row[i] for row in layout.rows for i in layout.fields if "," in row[i]]
    return bool(cells) and all(is_grouped(cell) for cell in cells)


def _checked_groups(layout: Layout, options: ReadOptions, source: str) -> Layout:
    if options.decimal is None and layout.delimiter != "," and _all_grouped(layout):
        raise _ambiguous_groups(layout, source)
    return layout


def _ambiguous_groups(layout: Layout, source: str) -> AmbiguousStructureError:
    cell = next(row[i] for row in layout.rows for i in layout.fields if "," in row[i])
    return AmbiguousStructureError(
        f"{cell!r} in {source} may be a thousand or a decimal fraction",
        hint="Say which with --decimal , (a fraction) or --decimal . (thousands).",
    )


def refuse_decimal_comma(
    layout: Layout, lines: list[str], options: ReadOptions, source: str
) -> None:
    """Refuse a comma that may be both the delimiter and the decimal mark.

    Raises:
        AmbiguousStructureError: Where the rows leave it open and no option settles it.
    """
    if layout.delimiter != "," or layout.decimal == "," or options.delimiter or options.decimal:
        return
    if any("." in cell or '"' in cell for row in layout.rows for cell in row):
        return
    if {cell for row in layout.rows for cell in row} <= {"0", "1"}:
        return  # states
    if _header_width(lines, layout) == layout.n_fields or not _looks_paired(lines, layout):
        return
    raise AmbiguousStructureError(
        f"the commas of {source} may be delimiters, decimal marks or both "
        f"(row {','.join(layout.rows[0])!r})",
        hint="Say which with --delimiter and --decimal.",
        ways=(
            _way(",", ".", "they only delimit"),
            _way(",", ",", "they are both"),
            _way("", ",", "a single column"),
        ),
    )


def _header_width(lines: list[str], layout: Layout) -> int:
    for line in reversed(lines[: layout.start]):
        cells = layout.split(COMMENT.sub("", line, count=1))
        if any(cells):
            while cells and not cells[-1]:
                cells.pop()
            return len(cells) if all(kind_of(c, ".") in "TWE" for c in cells) else 0
    return 0


def _looks_paired(lines: list[str], layout: Layout) -> bool:
    """Say whether every second cell can be the digits after a decimal comma."""
    widths = Counter(line.count(",") + 1 for line in lines[layout.start :] if line.strip())
    ragged = sum(n for width, n in widths.items() if width != layout.n_fields)
    if ragged > 0.2 * sum(widths.values()):
        return True
    if layout.n_fields % 2:
        return False
    if 2 * _header_width(lines, layout) == layout.n_fields:
        return True
    fractions = [row[i] for row in layout.rows for i in range(1, layout.n_fields, 2)]
    return all(f.isdigit() for f in fractions) and any(
        len(f) > 1 and f.startswith("0") for f in fractions
    )


def refuse_mixed_marks(layout: Layout, lines: list[str], options: ReadOptions, source: str) -> None:
    """Refuse numbers some of which have a decimal point and others a decimal comma.

    Raises:
        AmbiguousStructureError: Where no option settles it.
    """
    if options.decimal is not None or layout.paired:
        return
    other = "," if layout.decimal == "." else "."
    numbers = [i for i in layout.fields if layout.kinds[i] == "N"]
    wrong = _all_thousands(layout, numbers) if layout.decimal == "," else None
    n_wrong = 0
    for line in lines:
        cells = layout.split(line) if other in line else []
        if len(cells) != layout.n_fields or n_wrong >= _FEW:
            continue
        for cell in (cells[i] for i in numbers):
            if kind_of(cell, layout.decimal) == "T" and kind_of(cell, other) == "N":
                wrong, n_wrong = cell, n_wrong + 1
    if wrong is not None and (n_wrong >= _FEW or not n_wrong):
        raise AmbiguousStructureError(
            f"{wrong!r} in {source} has a decimal {_MARKS[other]} where other numbers have a "
            f"decimal {_MARKS[layout.decimal]}, or it counts thousands",
            hint="Export the capture with one decimal mark, or say which with --decimal.",
        )


def _all_thousands(layout: Layout, numbers: list[int]) -> str | None:
    """Return a cell of a column in which each has a point and three digits, if there is one."""
    for i in numbers:
        cells = [row[i] for row in layout.rows if row[i]]
        if len(cells) > _FEW and all(re.fullmatch(_THOUSAND, cell) for cell in cells):
            return cells[0]
    return None
