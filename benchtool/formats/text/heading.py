"""Names and units of the columns, from one or two header rows and a units row."""

from __future__ import annotations

from benchtool.formats.text import unitwords, words
from benchtool.formats.text.cells import kind_of
from benchtool.formats.text.layout import COMMENT, Layout, split_cells
from benchtool.frozen import frozen_record

_LETTERS = ("V", "v", "U", "u", "I", "i")
_MOST_ROWS = 3
_MOST_PASSED = 3  # lines between the header and the data, such as the title of a segment


@frozen_record(eq=False)
class Heading:
    """Names and units, one a field; empty where the file gives none.

    Attributes:
        names: Names, units taken off.
        units: Units as printed.
        raw: The cells as printed, for evidence.
        rows: Indices of the header rows among the lines.
        cells: Cells of the header rows, for figures that stand in them.
    """

    names: tuple[str, ...]
    units: tuple[str, ...]
    raw: tuple[str, ...]
    rows: tuple[int, ...] = ()
    cells: tuple[tuple[str, ...], ...] = ()

    @property
    def is_named(self) -> bool:
        """Whether the file has a header at all."""
        return bool(self.rows)


def read_heading(lines: list[str], layout: Layout) -> Heading:
    """Read the header rows above the first data row."""
    rows = _header_rows(lines, layout)
    empty = [""] * layout.n_fields
    names, units, raw = list(empty), list(empty), list(empty)
    for place, (_, cells) in enumerate(rows):
        spread = place == 0 and len(rows) > 1 and _is_group_row(cells, rows[1][1])
        for i, cell in enumerate((_spread(cells) if spread else cells)[: layout.n_fields]):
            if spread:
                names[i] = raw[i] = cell
            else:
                _take(cell, i, names, units, raw)
    return Heading(
        names=tuple(names),
        units=tuple(units),
        raw=tuple(raw),
        rows=tuple(i for i, _ in rows),
        cells=tuple(tuple(cells) for _, cells in rows),
    )


def _spread(cells: list[str]) -> list[str]:
    """Let each group name stand over the columns to its right."""
    spread: list[str] = []
    for cell in cells:
        spread.append(cell or (spread[-1] if spread else ""))
    return spread


def _take(cell: str, i: int, names: list[str], units: list[str], raw: list[str]) -> None:
    """Add what one header cell says of its column."""
    if not cell or (names[i] and kind_of(cell, ".") == "N"):
        return
    cell = "".join(c for c in cell if c.isprintable()).strip()
    raw[i] = f"{raw[i]} {cell}".strip()
    if _is_bracketed(cell) or (unitwords.is_unit(cell) and (names[i] or cell[:1] in "([")):
        units[i] = units[i] or cell.strip("()[]{}<> ")
        return
    name, unit = _named(cell)
    names[i] = f"{names[i]} {name}".strip()
    units[i] = units[i] or unit


def _named(cell: str) -> tuple[str, str]:
    """Split a header cell; an identifier such as ``out_mv`` keeps its whole name."""
    name, unit = words.split_unit(cell)
    if name in _LETTERS and unit and not unitwords.is_unit(unit):
        return cell, ""  # V(out): the voltage of a node, not a quantity in a unit
    if not unit:
        return cell, cell if unitwords.is_unit(cell) else ""
    whole = "_" in cell and not cell.endswith((")", "]", "}", ">"))
    return (cell if whole else name), unit


def _is_bracketed(cell: str) -> bool:
    pair = cell[:1] + cell[-1:]
    return pair in ("()", "[]", "{}", "<>") and not set("()[]{}<>") & set(cell[1:-1])


def _header_rows(lines: list[str], layout: Layout) -> list[tuple[int, list[str]]]:
    """Return up to three header rows, top first: group names, names, units."""
    found: list[tuple[int, list[str]]] = []
    passed = 0
    for i in range(layout.start - 1, -1, -1):
        cells = header_cells(lines[i], layout)
        if not any(cells) and not found:
            continue
        if _is_header(cells, layout, lines[i]) and _belongs(cells, found, layout, passed):
            found.insert(0, (i, cells))
        else:
            passed += 1
        if passed > (0 if found else _MOST_PASSED) or len(found) == _MOST_ROWS:
            break
    return found


def _belongs(
    cells: list[str], found: list[tuple[int, list[str]]], layout: Layout, passed: int
) -> bool:
    """Say whether a row belongs to the header; one further up must name a time."""
    if found:
        return _stacks(cells, found, layout)
    if _is_units_row(cells, layout):
        return True
    if any(_is_clock_cell(cell) and len(cell) > 1 for cell in cells):
        return True
    return passed == 0 and _names_most(cells, layout)


def _names_most(cells: list[str], layout: Layout) -> bool:
    """Say whether a row names the data columns: all, or all but a leading counter."""
    told = [bool(cells[i]) for i in layout.fields if i < len(cells)]
    return all(told[1:]) or sum(told) > len(told) / 2


def header_cells(line: str, layout: Layout) -> list[str]:
    """Split a header line into as many cells as there are columns, where it can be done."""
    text = COMMENT.sub("", line, count=1)
    if layout.delimiter == "":
        return [text.strip().strip('"')]
    cells = split_cells(text, layout.delimiter)
    if layout.delimiter == " ":
        cells = _wide_cells(text, cells, layout.n_fields)
    elif layout.paired and len(cells) == 2 * layout.n_fields:
        cells = cells[::2]
    while len(cells) > layout.n_fields and not cells[-1]:
        cells.pop()
    return cells


def _wide_cells(text: str, cells: list[str], n_fields: int) -> list[str]:
    """Put ``Time (s)`` together again where blanks delimit."""
    merged: list[str] = []
    for cell in cells:
        if merged and _is_bracketed(cell):
            merged[-1] += f" {cell}"
        else:
            merged.append(cell)
    if len(cells) == n_fields or len(merged) == n_fields:
        return cells if len(cells) == n_fields else merged
    for mark in (",", ";", "\t", "  "):
        parts = [part.strip() for part in text.strip().split(mark) if part.strip()]
        if len(parts) == n_fields:
            return parts
    return merged


def _is_header(cells: list[str], layout: Layout, line: str) -> bool:
    n_data = len(layout.fields)
    told = [cell for cell in cells if cell]
    if len(cells) > layout.n_fields or not (len(cells) == layout.n_fields or len(told) >= n_data):
        return False
    kinds = [kind_of(cell, layout.decimal) for cell in cells]
    if "T" not in kinds and "W" not in kinds and not any(unitwords.is_unit(c) for c in told):
        return False
    if layout.n_fields == 1 and any(mark in line for mark in ":="):
        return False
    if not any(kinds[i] == "N" for i in layout.fields if i < len(kinds)):
        return True  # figures only where there are no data: an increment, a start
    name, _ = words.split_unit(cells[0])
    return kinds[0] != "N" and (words.is_time_name(name) or words.is_index_name(name))


def _stacks(cells: list[str], found: list[tuple[int, list[str]]], layout: Layout) -> bool:
    """Say whether a row belongs above the header rows found so far."""
    below = found[0][1]
    if _is_units_row(below, layout):
        return len(found) == 1
    if _is_units_row(cells, layout):
        return True
    if layout.n_fields == 1:
        return False
    if any(_is_clock_cell(cell) for cell in below):
        return _is_group_row(cells, below)
    return any(_is_clock_cell(cell) for cell in cells)


def _is_units_row(cells: list[str], layout: Layout) -> bool:
    """Say whether the cells over the data are units and nothing else."""
    told = [cells[i] for i in layout.fields if i < len(cells) and cells[i]]
    return bool(told) and all(unitwords.is_unit(cell) or _is_bracketed(cell) for cell in told)


def _is_group_row(cells: list[str], below: list[str]) -> bool:
    """Say whether a row with holes tells apart columns that have the same name."""
    names = [name for name in below if name]
    return "" in cells and len(cells) == len(below) and len(set(names)) < len(names)


def _is_clock_cell(cell: str) -> bool:
    return bool(cell) and words.is_time_name(words.split_unit(cell)[0])
