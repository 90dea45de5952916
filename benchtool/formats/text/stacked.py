"""Where a record ends and another table begins: a spectrum, a histogram, another channel below.

Lines of text among the rows that name other columns, and have rows of their own, end the record.
The same names again do not: they head the next segment.
"""

from __future__ import annotations

import re
from collections.abc import Iterator

from benchtool.errors import AmbiguousStructureError
from benchtool.formats.text import unitwords, words
from benchtool.formats.text.cells import kind_of
from benchtool.formats.text.heading import header_cells
from benchtool.formats.text.layout import Layout, is_comment
from benchtool.formats.text.scanning import Scan
from benchtool.formats.text.structure import Structure
from benchtool.frozen import frozen_record
from benchtool.model.quantity import Notice

_TEXT_LINE = re.compile(rb"(?m)^[ \t\"',;|]*[^\d\s+\-.,;|\"'\0][^\n]*")
_LEAST_FRAME = 16


@frozen_record
class _Line:
    """A line of text among the rows."""

    number: int
    offset: int
    text: str
    below: tuple[str, ...]


@frozen_record
class OtherTable:
    """Where another table begins: its byte offset, and what is said of it."""

    offset: int
    notice: Notice


def other_table(structure: Structure, scan: Scan | None) -> OtherTable | None:
    """Return where another table begins below the record; None where there is none.

    Args:
        structure: The structure.
        scan: The first walk over its rows; None if that failed.
    """
    titles: list[str] = []
    number = 0
    for line in _text_lines(structure, scan):
        if line.number > number + len(titles) + 1:
            titles.clear()
        if not titles:
            number = line.number
        if _heads_other(line, titles, structure):
            notice = Notice(
                code="other-table",
                text=f"from line {line.number} on the file holds another table "
                f"({line.text.strip()[:40]!r}), which was left out",
            )
            return OtherTable(offset=line.offset, notice=notice)
        titles.append(line.text)
    return None


def _text_lines(structure: Structure, scan: Scan | None) -> Iterator[_Line]:
    """Yield the lines of text and comments among the rows, with the lines below each."""
    skipped = None if scan is None else {line for _, line, is_text in scan.skipped if is_text}
    number = structure.rows.first_line
    for offset, data in structure.rows.blocks():
        at = 0
        block = data if b"\n" in data else data.replace(b"\r", b"\n")
        for match in _TEXT_LINE.finditer(block):
            number += block.count(b"\n", at, match.start())
            at = match.start()
            text = match[0].decode(structure.rows.decoder.codec, errors="replace")
            if skipped is not None and number not in skipped and not is_comment(text):
                continue
            below = block[match.end() : match.end() + 400].decode("latin-1").split("\n")
            told = tuple(line for line in below if line.strip())
            yield _Line(number=number, offset=offset + match.start(), text=text, below=told[:2])
        number += block.count(b"\n", at)


def _heads_other(line: _Line, titles: list[str], structure: Structure) -> bool:
    """Say whether a line of text is the header of another table."""
    layout = structure.layout
    cells = _names(line.text, layout)
    if not cells or not _has_rows(line, layout):
        return False
    known = [_shown(row) for row in structure.heading.cells]
    if _shown(cells) in known:
        return _is_other_channel(titles, structure)
    return True


def _names(text: str, layout: Layout) -> list[str]:
    """Return the cells of a line if they name columns, else nothing."""
    cells = [cell for cell in header_cells(text, layout) if cell]
    kinds = {kind_of(cell, layout.decimal) for cell in cells}
    if layout.n_fields == 1:
        return cells if any(words.split_unit(cell)[1] for cell in cells) else []
    return cells if len(cells) > 1 and "T" in kinds and kinds <= {"T", "W"} else []


def _has_rows(line: _Line, layout: Layout) -> bool:
    """Say whether rows of numbers follow, a row of units between or none."""
    for below in line.below:
        cells = [cell for cell in layout.split(below) if cell]
        kinds = {kind_of(cell, layout.decimal) for cell in cells}
        if "T" not in kinds:
            return bool(kinds & {"N", "S"})
        if not all(unitwords.is_unit(cell) for cell in cells):
            return False
    return False


def _shown(cells: list[str] | tuple[str, ...]) -> tuple[str, ...]:
    told = (cell.lstrip("\ufeff").strip() for cell in cells)  # a mark opens each of two files
    return tuple(cell.casefold() for cell in told if cell)


def _is_other_channel(titles: list[str], structure: Structure) -> bool:
    """Say whether lines above a repeated header name another channel than those of the first."""
    layout = structure.layout
    first = {cell.casefold() for line in structure.above for cell in _cells(line, layout)}
    return any(
        words.is_channel_name(cell) and cell.casefold() not in first
        for line in titles
        for cell in _cells(line, layout)
    )


def _cells(line: str, layout: Layout) -> list[str]:
    return [part for cell in header_cells(line, layout) for part in re.split(r"\s*[:=]\s*", cell)]


def refuse_frames(structure: Structure, source: str) -> None:
    """Refuse rows without time that fall into frames of one length: no time joins them.

    Raises:
        AmbiguousStructureError: Where blank lines, comments or titles part such frames.
    """
    sizes = _frames(structure)
    if len(sizes) < 2 or min(sizes) < _LEAST_FRAME or len(set(sizes[:-1])) > 1:
        return
    if sizes[-1] > sizes[0]:
        return
    raise AmbiguousStructureError(
        f"the rows of {source} fall into {len(sizes)} frames of {sizes[0]} rows, and nothing says "
        "how far apart in time they are",
        hint="Save each frame as a file of its own, or export a time column.",
    )


def _frames(structure: Structure) -> list[int]:
    """Return the numbers of rows between lines that are none."""
    decimal, sizes, n_rows = structure.layout.decimal, [], 0
    for _, block in structure.rows.blocks():
        if not re.search(rb"\n\s*(?:\n|[^\d\s+\-.,;|\"'])", block):
            n_rows += block.count(b"\n")
            continue
        for line in block.decode(structure.rows.decoder.codec, errors="replace").splitlines():
            first = structure.layout.split(line)[:1] if line.strip() else []
            if first and not is_comment(line) and kind_of(first[0], decimal) != "T":
                n_rows += 1
            elif n_rows and (not first or words.speaks_of_segments(line)):
                sizes.append(n_rows)
                n_rows = 0
    return [*sizes, n_rows] if n_rows else sizes
