"""Finding the layout of a text: every delimiter is tried with both decimal marks.

The reading under which most lines are rows of numbers wins. Where two do equally well and mean
different numbers, the file is refused with the option that settles it.
"""

from __future__ import annotations

import re
from collections import Counter

from benchtool.errors import MalformedCaptureError
from benchtool.formats.text.cells import Kind, kind_of
from benchtool.formats.text.layout import DELIMITERS, Layout, is_comment, split_cells
from benchtool.formats.text.rivals import refuse_decimal_comma, single_best
from benchtool.model.capture import ReadOptions

_TRIED = (",", ";", "\t", "|", " ", "")
_SEP_LINE = re.compile(r"\s*\"?sep=(.)\"?\s*")
_WINDOW = 96
_ENOUGH = 12


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
        raise _no_rows(lines, source)
    best = single_best(found, options, source)
    refuse_decimal_comma(best, lines, options, source)
    return best


def _no_rows(lines: list[str], source: str) -> MalformedCaptureError:
    n_text = sum(bool(line.strip()) for line in lines)
    if n_text == 0:
        what, code = "holds nothing but blanks", "empty-file"
    else:
        what, code = f"has no row of numbers ({n_text} lines of other text)", "no-rows"
    return MalformedCaptureError(
        f"{source} {what}",
        hint="Check that the capture was saved with its data; "
        "--delimiter and --decimal overrule what was tried.",
        path=source,
        code=code,
    )


def _sound_layouts(lines: list[str], options: ReadOptions) -> list[tuple[int, Layout]]:
    """Return the layouts under which lines are rows, with their number of rows, best first."""
    found = []
    for delimiter, decimal, paired in _candidates(lines, options):
        layout = _try(lines, delimiter, decimal, paired=paired)
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


def _try(
    lines: list[str], delimiter: str, decimal: str, *, paired: bool
) -> tuple[int, Layout] | None:
    """Read the lines under one delimiter and decimal mark."""
    cells = [
        [] if is_comment(line) else split_cells(line, delimiter, paired=paired) for line in lines
    ]
    kinds = [tuple(kind_of(cell, decimal) for cell in row) for row in cells]
    widths = Counter(len(row) for row in kinds if _is_data(row))
    if delimiter == " ":
        widths.pop(1, None)
    if not widths:
        return None
    n_fields = _usual_width(kinds, widths)
    rows = [i for i, row in enumerate(kinds) if len(row) == n_fields and _is_data(row)]
    modal = _modal_kinds([kinds[i] for i in rows])
    good = [i for i in rows if _fits(kinds[i], modal)]
    if not good:
        return None
    start = _first_row(kinds, modal, good)
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


def _usual_width(kinds: list[tuple[Kind, ...]], widths: Counter[int]) -> int:
    """Return the number of fields of most rows; delimiters at the end of some do not count."""
    width = max(widths, key=lambda n: (widths[n], n))
    rows = [row for row in kinds if len(row) == width and _is_data(row)]
    held = max(i + 1 for row in rows for i, kind in enumerate(row) if kind != "E")
    return held if widths[held] > 0.3 * widths[width] else width


def _is_data(kinds: tuple[Kind, ...]) -> bool:
    return "T" not in kinds and ("N" in kinds or "S" in kinds)


def _modal_kinds(rows: list[tuple[Kind, ...]]) -> tuple[Kind, ...]:
    """Return the kind most rows have in each field; a field mostly empty holds no data."""
    modal: list[Kind] = []
    for column in zip(*rows, strict=True):
        counts = Counter(column)
        if 2 * counts["E"] > len(rows):
            modal.append("E")
            continue
        told = {kind: n for kind, n in counts.items() if kind in "NSW"}
        if "W" in told and "N" in told and 10 * told["W"] >= len(rows):
            told["W"] += told["N"]  # 0, 1 and x mixed: states
        modal.append(max(told, key=lambda kind: told[kind]) if told else "M")
    return tuple(modal)


def _fits(kinds: tuple[Kind, ...], modal: tuple[Kind, ...]) -> bool:
    pairs = [(a, b) for a, b in zip(kinds, modal, strict=True) if b in "NSW"]
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


def _data_beside(kinds: tuple[Kind, ...], modal: tuple[Kind, ...]) -> bool:
    return all(a == b for a, b in zip(kinds, modal, strict=True) if b in "NSW")
