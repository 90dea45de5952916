"""The first walk over the data rows: clocks, ranges, damage; the table itself where it is small."""

from __future__ import annotations

import math
from dataclasses import dataclass, field

import numpy as np

from benchtool.errors import MalformedCaptureError
from benchtool.formats.clock import ClockScan
from benchtool.formats.spool import ColumnSpool
from benchtool.formats.text.decoding import Decoded
from benchtool.formats.text.walking import BlockIndex, DataRows
from benchtool.model.arrays import AnyArray, FloatArray
from benchtool.model.quantity import Notice

_MOST_UNREADABLE = 0.2
_INTEGERS = (np.int8, np.int16, np.int32)


@dataclass(slots=True)
class Range:
    """What all values of a channel have in common."""

    low: float = np.inf
    high: float = -np.inf
    whole: bool = True
    binary: bool = True
    n_missing: int = 0
    n_told: int = 0

    def feed(self, values: FloatArray, counted: FloatArray | None) -> None:
        """Take the next values; ``counted`` is the clock, NaN where a row takes no part."""
        if not values.size:
            return
        low, high = float(values.min()), float(values.max())
        told = values
        if not math.isfinite(low + high):
            told = self._told(values, counted)
            if not told.size:
                return
            low, high = float(told.min()), float(told.max())
        self.n_told += told.size
        self.low, self.high = min(self.low, low), max(self.high, high)
        self.whole = self.whole and bool(np.all(told == np.rint(told)))
        self.binary = self.binary and bool(np.all((told == 0) | (told == 1)))

    def _told(self, values: FloatArray, counted: FloatArray | None) -> FloatArray:
        """Return the values that are there, and count the others."""
        told = np.isfinite(values)
        takes_part = np.isfinite(counted) if counted is not None else np.ones(values.size, bool)
        self.n_missing += int(np.count_nonzero(takes_part & ~told))
        return values[told]

    def narrowed(self, values: FloatArray) -> AnyArray:
        """Return values in the least type that holds all of the channel seen so far."""
        if self.whole and not self.n_missing and values.size:
            for dtype in _INTEGERS:
                limits = np.iinfo(dtype)
                if limits.min <= self.low and self.high <= limits.max:
                    with np.errstate(invalid="ignore"):  # NaN of rows that take no part
                        return values.astype(dtype)
        return values


@dataclass(slots=True)
class Scan:
    """The outcome of the first walk.

    Attributes:
        clocks: One a clock column.
        ranges: One a channel.
        index: Where blocks begin.
        n_rows: Rows up to the last that holds anything.
        table: All rows, where they are few.
        first: The first block's rows.
        spool: The columns that are walked again, where there is no table.
        spooled: Which these are; a clock may turn out uneven after they were chosen.
    """

    clocks: tuple[ClockScan, ...]
    ranges: tuple[Range, ...]
    index: BlockIndex = field(default_factory=BlockIndex)
    n_rows: int = 0
    table: FloatArray | None = None
    first: FloatArray = field(default_factory=lambda: np.empty((0, 0)))
    first_missing: int | None = None
    skipped: list[tuple[int, int, bool]] = field(default_factory=list)
    spool: ColumnSpool | None = None
    spooled: set[int] = field(default_factory=set)

    def spool_of(self, column: int) -> ColumnSpool | None:
        """Return where a column of the table is kept, None where it is decoded anew."""
        if self.spool is None or not self.spool.whole or column not in self.spooled:
            return None
        return self.spool

    def _is_spooled(self, column: int) -> bool:
        """Say whether a column will be walked again: not so the stamps of an even clock."""
        return column >= len(self.clocks) or not self.clocks[column].steps.even

    def keep(self, decoded: Decoded) -> None:
        """Put the columns of a block into the spool."""
        if self.spool is None:
            return
        table, n_clocks = decoded.table, len(self.clocks)
        self.spooled.update(k for k in range(table.shape[1]) if self._is_spooled(k))
        columns: list[AnyArray] = []
        for k in range(table.shape[1]):
            if k >= n_clocks:
                columns.append(self.ranges[k - n_clocks].narrowed(table[:, k]))
            else:
                columns.append(table[:, k] if self._is_spooled(k) else table[:0, k])
        self.spool.append(columns)

    def damage(self, source: str, *, counts_rows: bool) -> tuple[Notice, ...]:
        """Return notices of skipped rows and missing values; a footer is none.

        Raises:
            MalformedCaptureError: If a large part of the rows cannot be read.
        """
        inner = [s for s in self.skipped if s[0] < self.n_rows or not s[2]]
        n_rows = max(self.n_rows, inner[-1][0] + 1) if inner else self.n_rows
        if len(inner) > max(3, _MOST_UNREADABLE * n_rows):
            raise MalformedCaptureError(
                f"{len(inner)} of {n_rows} rows of {source} cannot be read, "
                f"the first in line {inner[0][1]}",
                hint="Look at that line: it is no row like the first ones. Save the capture again.",
                path=source,
                line=inner[0][1],
                code="rows-unreadable",
            )
        return (*_skipped_notice(inner, counts_rows=counts_rows), *self._missing_notice(inner))

    def _missing_notice(self, inner: list[tuple[int, int, bool]]) -> tuple[Notice, ...]:
        n_missing = sum(r.n_missing for r in self.ranges)
        if not self.clocks:
            n_missing -= len([s for s in inner if s[0] < self.n_rows]) * len(self.ranges)
        if n_missing <= 0:
            return ()
        where = f", the first in line {self.first_missing}" if self.first_missing else ""
        return (
            Notice(
                code="values-missing",
                text=f"{n_missing} cells hold no number{where}; nothing was put in their place",
            ),
        )

    @property
    def n_footer(self) -> int:
        """Number of text lines after the last row."""
        return sum(1 for row, _, text in self.skipped if row >= self.n_rows and text)


def _skipped_notice(inner: list[tuple[int, int, bool]], *, counts_rows: bool) -> tuple[Notice, ...]:
    if not inner:
        return ()
    kept = "their samples count as missing" if counts_rows else "they were left out"
    return (
        Notice(
            code="rows-skipped",
            text=f"{len(inner)} row(s) cannot be read, the first in line {inner[0][1]}; {kept}",
        ),
    )


def scan_rows(
    rows: DataRows,
    clocks: tuple[ClockScan, ...],
    n_channels: int,
    clock_of: tuple[int | None, ...],
    *,
    keep: bool,
) -> Scan:
    """Walk all rows once.

    Args:
        rows: The data rows; the decoded table holds the clocks first, then the channels.
        clocks: Scans of the clock columns, fed here.
        n_channels: Number of channels.
        clock_of: Clock of each channel, None where rows count.
        keep: Whether to hold the table; if not, what is walked again is spooled.
    """
    scan = Scan(
        clocks=clocks,
        ranges=tuple(Range() for _ in range(n_channels)),
        spool=None if keep else ColumnSpool(),
    )
    tables: list[FloatArray] = []
    n_rows, line = 0, rows.first_line
    for offset, decoded in rows.decoded():
        scan.index.add(n_rows, offset)
        _feed(scan, decoded, clock_of)
        _note_damage(scan, decoded, n_rows, line)
        if keep:
            tables.append(decoded.table)
        else:
            scan.keep(decoded)
        n_rows += decoded.table.shape[0]
        line += decoded.n_lines
    for clock in clocks:
        clock.finish()
    if keep and tables:
        table = np.concatenate(tables) if tables[1:] else tables[0]
        scan.table = table[: scan.n_rows]
    return scan


def _feed(scan: Scan, decoded: Decoded, clock_of: tuple[int | None, ...]) -> None:
    n_clocks = len(scan.clocks)
    if not scan.first.size:
        scan.first = decoded.table
    for k, clock in enumerate(scan.clocks):
        clock.feed(decoded.table[:, k])
    for k, (channel, of) in enumerate(zip(scan.ranges, clock_of, strict=True)):
        counted = decoded.table[:, of] if of is not None else None
        channel.feed(decoded.table[:, n_clocks + k], counted)


def _note_damage(scan: Scan, decoded: Decoded, n_rows: int, line: int) -> None:
    size = decoded.table.shape[0]
    while size and not np.isfinite(decoded.table[size - 1]).any():
        size -= 1
    if size:
        scan.n_rows = n_rows + size
    scan.skipped += [(row + n_rows, at + line, text) for row, at, text in decoded.skipped]
    if scan.first_missing is None and decoded.first_missing is not None:
        scan.first_missing = decoded.first_missing + line
