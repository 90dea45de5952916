"""Numbers from blocks of text: in bulk where a block is clean, row by row where it is not.

A block is clean if every line has the same delimiters and every data cell holds exactly one
token of digits, signs, points and exponents. An unclean block is halved until the damage is
confined to a few lines, and those alone are read cell by cell.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np

from benchtool.formats.text.cells import number
from benchtool.formats.text.digits import RowForm, parse_alike
from benchtool.formats.text.layout import Layout, is_comment
from benchtool.formats.text.regular import wanted_cells
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray

_LEAF = 64

Convert = Callable[[Sequence[str]], FloatArray]


@frozen_record(eq=False)
class Wanted:
    """One column to decode.

    Attributes:
        field: Its field in the row.
        convert: Turns cells that are no plain numbers into floats; None for plain numbers.
        second: Field of a second cell put before the first with a blank (date and time).
    """

    field: int
    convert: Convert | None = None
    second: int | None = None


@frozen_record(eq=False)
class Decoded:
    """The rows of one block: blank and comment lines left out.

    Attributes:
        table: Values, shape (rows, columns wanted), NaN where a cell holds none.
        skipped: Rows that do not have the fields of a row, with the line of each from the
            start of the block and whether it begins with text.
        n_missing: Cells without a value in the other rows.
        first_missing: Line of the first of those, from the start of the block.
        n_lines: Lines in the block.
    """

    table: FloatArray
    skipped: tuple[tuple[int, int, bool], ...] = ()
    n_missing: int = 0
    first_missing: int | None = None
    n_lines: int = 0


@frozen_record(eq=False)
class Decoder:
    """Decodes blocks of whole lines.

    Attributes:
        layout: Layout of the rows.
        wanted: The columns, in the order of the table.
        carriage: Whether a lone carriage return ends a line.
        codec: Encoding of words in cells.
        n_clocks: How many of the wanted columns, the first ones, are clocks; a row without any
            time is none.
        may_be_short: Whether rows may end early, since one of several channels has ended.
    """

    layout: Layout
    wanted: tuple[Wanted, ...]
    carriage: bool = False
    codec: str = "utf-8"
    n_clocks: int = 0
    may_be_short: bool = False

    def decode(self, block: bytes) -> Decoded:
        """Decode a block of whole lines."""
        lines = block.replace(b"\r", b"\n" if self.carriage else b"")
        body = lines.rstrip(b"\n") + b"\n"
        return _merged(self._pieces(body), len(lines) - len(body))

    def only(self, place: int) -> Decoder:
        """Return a decoder of one of the wanted columns; it sees the same rows."""
        return replace(self, wanted=(self.wanted[place],), n_clocks=0)

    def _pieces(self, block: bytes) -> list[Decoded]:
        """Decode in bulk, halving where that fails."""
        table = self._bulk(block)
        if table is not None:
            return [Decoded(table=table, n_lines=table.shape[0])]
        middle = block.find(b"\n", len(block) // 2) + 1
        if 0 < middle < len(block) and block.count(b"\n") > _LEAF:
            return [*self._pieces(block[:middle]), *self._pieces(block[middle:])]
        return [self._by_rows(block)]

    def _bulk(self, block: bytes) -> FloatArray | None:
        """Decode a clean block; None where it is not clean."""
        if self.layout.paired or not block:
            return None
        text = self._marked(block if block.endswith(b"\n") else block + b"\n")
        if text is None:
            return None
        plain = [i for i, w in enumerate(self.wanted) if w.convert is None]
        numbers = self._numbers(text, tuple(self.wanted[i].field for i in plain))
        if numbers is None:
            return None
        if len(plain) == len(self.wanted):
            return numbers
        return self._with_words(block, numbers, plain)

    def _marked(self, block: bytes) -> bytes | None:
        """Return the block without its quotes; None where they shield a delimiter."""
        if b'"' not in block:
            return block
        mark = self.layout.delimiter
        return None if mark and _quotes_shield(block, mark) else block.replace(b'"', b"")

    def _numbers(self, text: bytes, fields: tuple[int, ...]) -> FloatArray | None:
        if not fields:
            return np.empty((text.count(b"\n"), 0))
        mark = self.layout.delimiter.encode()
        form = RowForm(
            mark=mark,
            decimal=self.layout.decimal.encode(),
            n_fields=self.layout.n_fields,
            fields=fields,
        )
        values = parse_alike(text, form)
        if values is not None:
            return values
        return self._floats(text, fields)

    def _floats(self, text: bytes, fields: tuple[int, ...]) -> FloatArray | None:
        """Give every cell to ``float``: for rows that differ in more than their digits."""
        n_rows = text.count(b"\n")
        if self.layout.decimal == ",":
            if b"." in text:
                return None
            text = text.replace(b",", b".")
        mark = self.layout.delimiter.encode()
        cells = wanted_cells(text, mark, self.layout.n_fields, fields, n_rows)
        tokens = cells.split() if cells is not None else []
        if len(tokens) != n_rows * len(fields):
            return None
        try:
            floats = np.fromiter(map(float, tokens), np.float64, len(tokens))
        except ValueError:
            return None
        return floats.reshape(n_rows, len(fields))

    def _with_words(self, block: bytes, numbers: FloatArray, plain: list[int]) -> FloatArray | None:
        """Fill in the columns of stamps and words."""
        rows = [self.layout.split(line) for line in self._lines(block)]
        table = np.empty((len(rows), len(self.wanted)))
        if len(rows) != numbers.shape[0]:
            return None
        table[:, plain] = numbers
        for i, wanted in enumerate(self.wanted):
            if wanted.convert is not None:
                table[:, i] = wanted.convert([_cell(row, wanted) for row in rows])
        return None if np.isnan(table).any() else table

    def _lines(self, block: bytes) -> list[str]:
        text = block.decode(self.codec, errors="replace")
        return text[:-1].split("\n") if text.endswith("\n") else text.split("\n")

    def _by_rows(self, block: bytes) -> Decoded:
        """Decode line by line, forgiving."""
        rows: list[list[float]] = []
        skipped: list[tuple[int, int, bool]] = []
        missing: list[int] = []
        lines = self._lines(block) if block else []
        for i, line in enumerate(lines):
            if not line.strip("\0 \t\r") or is_comment(line):
                continue
            values = self._row(line)
            if values is None or all(map(math.isnan, values[: self.n_clocks or None])):
                skipped.append((len(rows), i, self._is_text(line)))
                values = [math.nan] * len(self.wanted)
            elif any(map(math.isnan, values)):
                missing.append(i)
            rows.append(values)
        return Decoded(
            table=np.array(rows).reshape(len(rows), len(self.wanted)),
            skipped=tuple(skipped),
            n_missing=len(missing),
            first_missing=missing[0] if missing else None,
            n_lines=len(lines),
        )

    def _row(self, line: str) -> list[float] | None:
        cells = self.layout.split(line)
        while len(cells) > self.layout.n_fields and not cells[-1]:
            cells.pop()
        if len(cells) != self.layout.n_fields and not self._may_be_short(cells):
            return None
        cells += [""] * (self.layout.n_fields - len(cells))
        return [self._value(cells, wanted) for wanted in self.wanted]

    def _may_be_short(self, cells: list[str]) -> bool:
        """Say whether only empty trailing fields are lacking."""
        least = 1 if self.may_be_short else max(self.layout.fields)
        return least < len(cells) < self.layout.n_fields

    def _value(self, cells: list[str], wanted: Wanted) -> float:
        if wanted.convert is None:
            return number(cells[wanted.field], self.layout.decimal)
        return float(wanted.convert([_cell(cells, wanted)])[0])

    def _is_text(self, line: str) -> bool:
        """Say whether a line that is no row begins with text: a footer, not a damaged row."""
        return math.isnan(number(self.layout.split(line)[:1][0], self.layout.decimal))


def _quotes_shield(block: bytes, mark: str) -> bool:
    """Say whether some quoted cell holds the delimiter."""
    buffer = np.frombuffer(block, np.uint8)
    inside = np.cumsum(buffer == ord('"')) & 1
    return bool(np.any((buffer == ord(mark)) & (inside == 1)))


def _cell(row: Sequence[str], wanted: Wanted) -> str:
    cell = row[wanted.field] if wanted.field < len(row) else ""
    if wanted.second is not None and wanted.second < len(row):
        return f"{row[wanted.second]} {cell}"
    return cell


def _merged(pieces: list[Decoded], n_blank: int) -> Decoded:
    """Join the pieces of a block, counting rows and lines from its start."""
    skipped: list[tuple[int, int, bool]] = []
    n_rows = n_lines = n_missing = 0
    first: int | None = None
    for piece in pieces:
        skipped += [(row + n_rows, line + n_lines, text) for row, line, text in piece.skipped]
        if first is None and piece.first_missing is not None:
            first = piece.first_missing + n_lines
        n_rows += piece.table.shape[0]
        n_lines += piece.n_lines
        n_missing += piece.n_missing
    return Decoded(
        table=np.concatenate([piece.table for piece in pieces]) if pieces[1:] else pieces[0].table,
        skipped=tuple(skipped),
        n_missing=n_missing,
        first_missing=first,
        n_lines=n_lines + n_blank,
    )
