"""Numbers from blocks of text: in bulk where lines are sound, one by one where they are not.

Lines that differ in nothing but digits, all of a block or those of each shape, are read straight
from their bytes. Of the others the cells are found first, and the numbers in them read all at
once. What is left, lines with another number of cells and cells with something else in them, is
read line by line.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np

from benchtool.formats.magnitudes import in_range
from benchtool.formats.text.alike import parse_alike
from benchtool.formats.text.cells import number
from benchtool.formats.text.layout import Layout, is_comment
from benchtool.formats.text.lineends import with_newlines
from benchtool.formats.text.numerals import ROOM, parse_cells
from benchtool.formats.text.regular import Cells, find_cells
from benchtool.formats.text.rowform import RowForm
from benchtool.formats.text.shapes import chosen_lines, parse_mixed
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, IntArray, NDArray

_PART_BYTES = 1 << 18
_PLAIN = b"0123456789+-.eE"
_BLANK_ENDS = (b"\n\n", b"\n\r\n", b"\n\r\r\n")
_BEGINS = np.isin(np.arange(256), np.frombuffer(b"0123456789+-.,", np.uint8))

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
        codec: Encoding of words in cells.
        n_clocks: How many of the wanted columns, the first ones, are clocks; a row without any
            time is none.
        may_be_short: Whether rows may end early, since one of several channels has ended.
    """

    layout: Layout
    wanted: tuple[Wanted, ...]
    codec: str = "utf-8"
    n_clocks: int = 0
    may_be_short: bool = False

    def decode(self, block: bytes) -> Decoded:
        """Decode a block of whole lines."""
        decoded = self._in_bulk(block)
        if decoded is not None:
            return decoded
        lines = with_newlines(block)
        body = lines
        if lines.endswith(b"\n\n") or not lines.endswith(b"\n"):
            body = lines.rstrip(b"\n") + b"\n"
        n_blank = len(lines) - len(body)
        table, odd = self._in_parts(body)
        return self._told(body, table, odd, n_blank)

    def _in_bulk(self, block: bytes) -> Decoded | None:
        """Decode a block most of whose rows are of one shape or a few; None where they are not."""
        plain = tuple(wanted.field for wanted in self.wanted if wanted.convert is None)
        ends_well = block.endswith(b"\n") and not block.endswith(_BLANK_ENDS)
        if len(plain) < len(self.wanted) or self.layout.paired or not ends_well:
            return None
        form = self._form(plain)
        alike = parse_alike(block, form)
        if alike is not None and alike[1] is None:
            return Decoded(table=alike[0], n_lines=alike[0].shape[0])
        mixed = parse_mixed(block, form)
        if mixed is None:
            return None
        table, left, stops = mixed
        if not left.size:
            return Decoded(table=table, n_lines=stops.size)
        rest = with_newlines(chosen_lines(block, left, stops)) if left.size < stops.size else b""
        if rest.count(b"\n") != left.size:
            return None  # too many, or a line end that is a CR alone
        table[left], odd = self._in_parts(rest)
        return self._told(block, table, left[odd], 0)

    def _told(self, body: bytes, table: FloatArray, odd: IntArray, n_blank: int) -> Decoded:
        n_lines = table.shape[0] + n_blank
        if not odd.size:
            return Decoded(table=table, n_lines=n_lines)
        return replace(self._with_odd(with_newlines(body), table, odd), n_lines=n_lines)

    def only(self, place: int) -> Decoder:
        """Return a decoder of one of the wanted columns; it sees the same rows."""
        return replace(self, wanted=(self.wanted[place],), n_clocks=0)

    def _in_parts(self, body: bytes) -> tuple[FloatArray, IntArray]:
        """Return what ``_bulk`` does, few lines at a time: their arrays stay in the cache."""
        tables: list[FloatArray] = []
        odd: list[IntArray] = []
        at = n_lines = 0
        while at < len(body):
            stop = body.find(b"\n", min(at + _PART_BYTES, len(body) - 1)) + 1
            table, lines = self._bulk(body[at:stop])
            tables.append(table)
            odd.append(lines + n_lines)
            at, n_lines = stop, n_lines + table.shape[0]
        return (np.concatenate(tables), np.concatenate(odd)) if tables[1:] else (tables[0], odd[0])

    def _bulk(self, body: bytes) -> tuple[FloatArray, IntArray]:
        """Return a row of the table for each line, and the lines left to be read one by one."""
        plain = [i for i, wanted in enumerate(self.wanted) if wanted.convert is None]
        fields = [self.wanted[i].field for i in plain]
        text = self._marked(body)
        if text is None:
            n_lines = body.count(b"\n")
            return np.full((n_lines, len(self.wanted)), np.nan), np.arange(n_lines)
        cells = find_cells(text, self.layout.delimiter.encode(), self.layout.n_fields)
        table = np.full((cells.n_lines, len(self.wanted)), np.nan, order="F")
        rows = np.delete(np.arange(cells.n_lines), cells.odd) if cells.odd.size else slice(None)
        sound = not cells.odd.size
        if cells.starts.size:
            for i, field in zip(plain, fields, strict=True):
                table[rows, i], all_told = self._column(text, cells, field)
                sound = sound and all_told
            if len(plain) < len(self.wanted):
                sound = self._fill_words(body, table, rows) and sound
        empty: IntArray = np.empty(0, np.int64)
        return table, empty if sound else np.flatnonzero(np.isnan(table).any(axis=1))

    def _form(self, fields: tuple[int, ...]) -> RowForm:
        return RowForm(
            mark=self.layout.delimiter.encode(),
            decimal=self.layout.decimal.encode(),
            n_fields=self.layout.n_fields,
            fields=fields,
        )

    def _marked(self, block: bytes) -> bytes | None:
        """Return the block without its quotes; None where cells are not what lies between marks."""
        if self.layout.paired:
            return None
        if b'"' not in block:
            return block
        mark = self.layout.delimiter
        return None if mark and _quotes_shield(block, mark) else block.replace(b'"', b"")

    def _column(self, text: bytes, cells: Cells, field: int) -> tuple[FloatArray, bool]:
        """Return the numbers of a field, and whether all of its cells hold one."""
        starts, stops = cells.starts[:, field], cells.stops[:, field]
        values, odd = parse_cells(
            bytes(ROOM) + text, starts + ROOM, stops + ROOM, self.layout.decimal.encode()
        )
        if odd is None:
            return values, True
        for i in np.flatnonzero(odd).tolist():
            values[i] = self._number(text[starts[i] : stops[i]])
        return values, not np.isnan(values[odd]).any()

    def _number(self, cell: bytes) -> float:
        """Return the number in one cell, NaN where it holds none."""
        if self.layout.decimal == "." and not cell.strip().translate(None, _PLAIN):
            try:
                return in_range(float(cell))
            except ValueError:
                return math.nan
        return number(cell.decode(self.codec, errors="replace"), self.layout.decimal)

    def _fill_words(self, body: bytes, table: FloatArray, rows: IntArray | slice) -> bool:
        """Fill in the columns of stamps and words; say whether all cells told something."""
        lines = body.decode(self.codec, errors="replace")[:-1].split("\n")
        chosen = lines if isinstance(rows, slice) else [lines[i] for i in rows.tolist()]
        split = [self.layout.split(line) for line in chosen]
        sound = True
        for i, wanted in enumerate(self.wanted):
            if wanted.convert is not None:
                values = wanted.convert([_cell(row, wanted) for row in split])
                table[rows, i] = values
                sound = sound and not np.isnan(values).any()
        return sound

    def _with_odd(self, body: bytes, table: FloatArray, odd: IntArray) -> Decoded:
        """Read the odd lines one by one, forgiving."""
        stops = np.flatnonzero(np.frombuffer(body, np.uint8) == ord("\n"))
        starts = np.concatenate([[0], stops[:-1] + 1])
        known = self._only_lacks_values(body, table, odd, starts)
        missing = odd[known].tolist()
        skipped: list[tuple[int, int, bool]] = []
        left_out: list[int] = []
        for i in odd[~known].tolist():
            line = body[starts[i] : stops[i]].decode(self.codec, errors="replace")
            if not line.strip("\0 \t\r") or is_comment(line):
                left_out.append(i)
                continue
            values = self._row(line)
            if values is None or all(map(math.isnan, values[: self.n_clocks or None])):
                skipped.append((i - len(left_out), i, self._is_text(line)))
                values = [math.nan] * len(self.wanted)
            elif any(map(math.isnan, values)):
                missing.append(i)
            table[i] = values
        return Decoded(
            table=np.delete(table, left_out, axis=0) if left_out else table,
            skipped=tuple(skipped),
            n_missing=len(missing),
            first_missing=min(missing, default=None),
        )

    def _only_lacks_values(
        self, body: bytes, table: FloatArray, odd: IntArray, starts: IntArray
    ) -> NDArray[np.bool_]:
        """Say which lines have their time and all cells, and lack no more than a number."""
        if not self.n_clocks:
            return np.zeros(odd.size, np.bool_)
        timed = np.isfinite(table[odd, : self.n_clocks]).any(axis=1)
        begins: NDArray[np.bool_] = _BEGINS[np.frombuffer(body, np.uint8)[starts[odd]]]
        return timed & begins

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
        cell, *others = self.layout.split(line)
        if not cell and not any(others):
            return True  # nothing but delimiters, as spreadsheets leave below the rows
        return bool(cell) and cell[0] not in "+-.,0123456789" and cell.lower() != "nan"


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
