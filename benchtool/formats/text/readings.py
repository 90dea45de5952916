"""Finding the layout of a text: every delimiter is tried with both decimal marks.

The reading under which most lines are rows of numbers wins. Where two do equally well and mean
different numbers, the file is refused with the option that settles it.
"""

from __future__ import annotations

import re
from collections import Counter

from benchtool.errors import MalformedCaptureError
from benchtool.formats.text.cells import Kind, kind_of
from benchtool.formats.text.labels import with_labels
from benchtool.formats.text.layout import DELIMITERS, Layout, is_comment, split_cells
from benchtool.formats.text.rivals import refuse_decimal_comma, refuse_mixed_marks, single_best
from benchtool.model.capture import ReadOptions

_TRIED = (",", ";", "\t", "|", " ", "")
_SEP_LINE = re.compile(r"\s*\"?sep=(.)\"?\s*")
_WINDOW = 96
_ENOUGH = 12
_EMPTY: Kind = "E"
_SHORTEST_CHANNEL = 12  # rows of a channel that ends before the others; metadata are fewer


def find_layout(lines: list[str], options: ReadOptions, source: str) -> Layout:
    """Find the layout of a text from its first lines.

    Raises:
        AmbiguousStructureError: If two layouts are equally sound.
        MalformedCaptureError: If no line holds numbers.
    """
    for window in (_WINDOW, len(lines)):
        found = _sound_layouts(lines[:window], options)
        if found and (found[0][0] >= _ENOUGH or window >= len(lines)):
            break
    if not found:
        raise _no_rows(lines, options, source)
    best = single_best(found, options, source)
    refuse_decimal_comma(best, lines, options, source)
    refuse_mixed_marks(best, lines[:window], options, source)
    return best


def _no_rows(lines: list[str], options: ReadOptions, source: str) -> MalformedCaptureError:
    from benchtool.formats.text.overruled import rows_hint

    n_text = sum(bool(line.strip()) for line in lines)
    if n_text == 0:
        what, code = "holds nothing but blanks", "empty-file"
    else:
        what, code = f"has no row of numbers ({n_text} lines of other text)", "no-rows"
    return MalformedCaptureError(
        f"{source} {what}",
        hint=rows_hint(lines, options, _sound_layouts),
        path=source,
        code=code,
    )


def _sound_layouts(lines: list[str], options: ReadOptions) -> list[tuple[int, Layout]]:
    """Return the layouts under which lines are rows, with their number of rows, best first."""
    found = []
    for delimiter, decimal, paired in _candidates(lines, options):
        layout = _read_under(lines, delimiter, decimal, paired=paired)
        if layout is not None:
            found.append(layout)
    return sorted(found, key=lambda item: -item[0])


def _candidates(lines: list[str], options: ReadOptions) -> list[tuple[str, str, bool]]:
    text = "\n".join(lines)
    delimiters = [d for d in _TRIED if d in text]
    if "\t" in delimiters and " " in delimiters:
        delimiters.remove(" ")
    stated = _stated_delimiter(lines, options)
    if stated is not None:
        delimiters = [stated]
    decimals = [options.decimal] if options.decimal else [".", ","] if "," in text else ["."]
    pairs = [(d, m, False) for d in delimiters for m in decimals if d != "," or m != ","]
    quoted = '"' in text
    if "," in delimiters and "," in decimals:
        asked = options.delimiter is not None and options.decimal is not None
        pairs += [(",", ",", asked and not quoted)] if quoted or asked else []
    return pairs


def _stated_delimiter(lines: list[str], options: ReadOptions) -> str | None:
    if options.delimiter is not None:
        return DELIMITERS.get(options.delimiter, options.delimiter.replace("\\t", "\t"))
    match = _SEP_LINE.fullmatch(lines[0]) if lines else None
    return match[1] if match else None


def _read_under(
    lines: list[str], delimiter: str, decimal: str, *, paired: bool
) -> tuple[int, Layout] | None:
    """Read the lines under one delimiter and decimal mark; None where no line is a row then."""
    cells = [
        [] if is_comment(line) else split_cells(line, delimiter, paired=paired) for line in lines
    ]
    kinds = [tuple(kind_of(cell, decimal) for cell in row) for row in cells]
    if delimiter not in ("", " "):
        kinds = with_labels(cells, kinds)
    n_fields = _width_of_rows(cells, kinds, delimiter)
    if n_fields is None:
        return None
    rows = [i for i, row in enumerate(kinds) if len(row) == n_fields and _is_data(row)]
    modal = _modal_kinds([kinds[i] for i in rows])
    good = [i for i in rows if _fits(kinds[i], modal)]
    if not good:
        return None
    start = _first_row(kinds, modal, _largest_table(cells, kinds, good))
    layout = Layout(
        delimiter=delimiter,
        decimal=decimal,
        n_fields=n_fields,
        start=start,
        kinds=modal,
        rows=tuple(tuple(cells[i]) for i in good if i >= start),
        paired=paired,
        evidence=f"{len(good)} of the first {len(lines)} lines are rows of {n_fields}",
    )
    return len(good), layout


def _width_of_rows(
    cells: list[list[str]], kinds: list[tuple[Kind, ...]], delimiter: str
) -> int | None:
    """Return the number of fields of a row; None where no line can be one."""
    widths = Counter(len(row) for row in kinds if _is_data(row))
    if delimiter == " ":
        widths.pop(1, None)
    if not widths:
        return None
    n_fields = _usual_width(kinds, widths)
    if delimiter in ("", " "):
        return n_fields
    return _with_metadata_right(cells, kinds, n_fields)


def _usual_width(kinds: list[tuple[Kind, ...]], widths: Counter[int]) -> int:
    """Return the number of fields of most rows; delimiters at the end of some do not count."""
    width = max(widths, key=lambda n: (widths[n], n))
    rows = [row for row in kinds if len(row) == width and _is_data(row)]
    held = max(i + 1 for row in rows for i, kind in enumerate(row) if kind != "E")
    return held if widths[held] > 0.3 * widths[width] else width


def _with_metadata_right(
    cells: list[list[str]], kinds: list[tuple[Kind, ...]], n_fields: int
) -> int:
    """Return the width of rows that have metadata to their right in the first rows only.

    The narrower rows below are filled up with empty cells.
    """
    first = next((i for i, row in enumerate(kinds) if len(row) == n_fields and _is_data(row)), 0)
    modal = kinds[first] if kinds else ()
    wide = []
    for i in range(first - 1, -1, -1):
        if len(kinds[i]) <= n_fields or kinds[i][:n_fields] != modal:
            break
        wide.append(i)
    if not modal or not wide:
        return n_fields
    width = max(len(kinds[i]) for i in wide)
    for i, row in enumerate(kinds):
        if (_is_data(row) and len(row) == n_fields) or i in wide:
            n_lacking = width - len(row)
            kinds[i] = (*row, *[_EMPTY] * n_lacking)
            cells[i] = [*cells[i], *([""] * n_lacking)]
    return width


def _is_data(kinds: tuple[Kind, ...]) -> bool:
    return "T" not in kinds and ("N" in kinds or "S" in kinds)


def _modal_kinds(rows: list[tuple[Kind, ...]]) -> tuple[Kind, ...]:
    """Return the kind most rows have in each field; a field mostly empty holds no data."""
    modal: list[Kind] = []
    for column in zip(*rows, strict=True):
        counts = Counter(column)
        if 2 * counts["E"] > len(rows) and not _is_sparse(column):
            modal.append("E")
            continue
        told = {kind: n for kind, n in counts.items() if kind in "NSWHL"}
        if "W" in told and "N" in told and 10 * told["W"] >= len(rows):
            told["W"] += told["N"]  # 0, 1 and x mixed: states
        modal.append(max(told, key=lambda kind: told[kind]) if told else "M")
    return tuple(modal)


def _is_sparse(column: tuple[Kind, ...]) -> bool:
    """Say whether a mostly empty column is a channel: one that ends early, or tells changes."""
    n_told = sum(kind != "E" for kind in column)
    if n_told < _SHORTEST_CHANNEL:
        return False
    sparse = 4 * n_told >= len(column) and set(column[-(len(column) // 4) :]) != {"E"}
    return set(column[:n_told]) == {"N"} or (sparse and set(column) <= {"N", "W", "E"})


def _fits(kinds: tuple[Kind, ...], modal: tuple[Kind, ...]) -> bool:
    pairs = [(a, b) for a, b in zip(kinds, modal, strict=True) if b in "NSWHL"]
    agree = sum(a == b or (b == "W" and a == "N") for a, b in pairs)
    return agree > 0 and all(a == b or a in "EM" or b == "W" for a, b in pairs)


def _first_row(kinds: list[tuple[Kind, ...]], modal: tuple[Kind, ...], good: list[int]) -> int:
    """Return where data begin: rows beside metadata count, a lone early row does not."""
    start = good[0]
    if len(good) > 3 and any("T" in row for row in kinds[start + 1 : good[1]]):
        start = good[1]
    while start > 0:
        before = kinds[start - 1]
        if len(before) != len(modal) or not _data_beside(before, modal):
            break
        start -= 1
    return start


def _largest_table(
    cells: list[list[str]], kinds: list[tuple[Kind, ...]], good: list[int]
) -> list[int]:
    """Return the rows below the last header where a few rows of another table stand above."""
    heads = [
        i
        for i in range(good[0], good[-1])
        if set(kinds[i]) <= {"T", "W", "E"} and kinds[i].count("T") > 1
    ]
    above = {tuple(row) for row in cells[: good[0]]}
    for i in reversed(heads):
        below = [row for row in good if row > i]
        if tuple(cells[i]) not in above and 2 * len(below) > len(good):
            return below
    return good


def _data_beside(kinds: tuple[Kind, ...], modal: tuple[Kind, ...]) -> bool:
    return all(a == b for a, b in zip(kinds, modal, strict=True) if b in "NSWH")
