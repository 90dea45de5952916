"""How the lines of a delimited text fall into cells."""

from __future__ import annotations

import re
from dataclasses import field

from benchtool.formats.text.cells import Kind
from benchtool.frozen import frozen_record

DELIMITERS = {"comma": ",", "semicolon": ";", "tab": "\t", "pipe": "|", "space": " ", "none": ""}
_NAMES = {"\t": "tab", " ": "space", "": "none"}
COMMENT = re.compile(r"^\s*(?:#|//|%|!|\*(?!\*)\s)\s*")


@frozen_record(eq=False)
class Layout:
    """How the lines of a text fall into cells.

    Attributes:
        delimiter: The delimiter, a blank for runs of blanks, empty where there is one column.
        decimal: ``.`` or ``,``.
        n_fields: Cells of a data row.
        start: Index of the first data row among the lines.
        kinds: What each field holds in most rows.
        rows: Cells of the first data rows.
        paired: Whether two cells each make one number (decimal comma, comma delimiter).
        evidence: What delimiter and decimal mark were found from.
    """

    delimiter: str
    decimal: str
    n_fields: int
    start: int
    kinds: tuple[Kind, ...]
    rows: tuple[tuple[str, ...], ...] = field(repr=False)
    paired: bool = False
    evidence: str = ""

    def split(self, line: str) -> list[str]:
        """Return the cells of a line, blanks and quotes taken off."""
        return split_cells(line, self.delimiter, paired=self.paired)

    @property
    def fields(self) -> tuple[int, ...]:
        """Fields that hold data."""
        return tuple(i for i, kind in enumerate(self.kinds) if kind in "NSWH")


def delimiter_name(delimiter: str) -> str:
    """Return a delimiter as it is shown and typed: ``tab``, ``space`` and ``none`` are words."""
    return _NAMES.get(delimiter, delimiter)


def split_cells(line: str, delimiter: str, *, paired: bool = False) -> list[str]:
    """Split a line into cells; quotes shield a delimiter."""
    if delimiter == " ":
        return [cell.strip('"') for cell in line.split()]
    if delimiter == "":
        return [line.strip().strip('"').strip()]
    quoted = '"' in line
    row = _quoted_cells(line.strip("\r\n"), delimiter) if quoted else line.split(delimiter)
    cells = [cell.strip().strip("'") for cell in row]
    return _joined(cells) if paired else cells


def _quoted_cells(line: str, delimiter: str) -> list[str]:
    import csv

    try:
        return next(csv.reader([line], delimiter=delimiter, skipinitialspace=True), [])
    except csv.Error:  # a cell of more than 131,072 characters
        return line.split(delimiter)


def _joined(cells: list[str]) -> list[str]:
    if len(cells) % 2:
        return cells
    return [f"{a},{b}" for a, b in zip(cells[::2], cells[1::2], strict=True)]


def is_comment(line: str) -> bool:
    """Say whether a line is marked as a comment."""
    return COMMENT.match(line) is not None
