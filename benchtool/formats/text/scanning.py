"""The first walk over the data rows: clocks, ranges, damage; the table itself where it is small."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from benchtool.errors import MalformedCaptureError
from benchtool.formats.clock import ClockScan
from benchtool.formats.text.decoding import Decoded
from benchtool.formats.text.walking import BlockIndex, DataRows
from benchtool.model.arrays import FloatArray
from benchtool.model.quantity import Notice

_MOST_UNREADABLE = 0.2


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
        told = values[np.isfinite(values)]
        takes_part = np.isfinite(counted) if counted is not None else np.ones(values.size, bool)
        self.n_missing += int(np.count_nonzero(takes_part & ~np.isfinite(values)))
        if not told.size:
            return
        self.n_told += told.size
        self.low, self.high = min(self.low, float(told.min())), max(self.high, float(told.max()))
        self.whole = self.whole and bool(np.all(told == np.rint(told)))
        self.binary = self.binary and bool(np.all((told == 0) | (told == 1)))


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
    """

    clocks: tuple[ClockScan, ...]
    ranges: tuple[Range, ...]
    index: BlockIndex = field(default_factory=BlockIndex)
    n_rows: int = 0
    table: FloatArray | None = None
    first: FloatArray = field(default_factory=lambda: np.empty((0, 0)))
    first_missing: int | None = None
    skipped: list[tuple[int, int, bool]] = field(default_factory=list)

    def damage(self, source: str, *, counts_rows: bool) -> tuple[Notice, ...]:
        """Return notices of skipped rows and missing values; a footer is none.

        Raises:
            MalformedCaptureError: If a large part of the rows cannot be read.
        """
        inner = [s for s in self.skipped if s[0] < self.n_rows or not s[2]]
        if len(inner) > max(3, _MOST_UNREADABLE * self.n_rows):
            raise MalformedCaptureError(
                f"{len(inner)} of {self.n_rows} rows of {source} cannot be read, "
                f"the first in line {inner[0][1]}",
                hint="Look at that line; --delimiter and --decimal overrule what was tried.",
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
        keep: Whether to hold the table.
    """
    scan = Scan(clocks=clocks, ranges=tuple(Range() for _ in range(n_channels)))
    tables: list[FloatArray] = []
    n_rows, line = 0, rows.first_line
    for offset, decoded in rows.decoded():
        scan.index.add(n_rows, offset)
        _feed(scan, decoded, clock_of)
        _note_damage(scan, decoded, n_rows, line)
        if not scan.first.size:
            scan.first = decoded.table
        if keep:
            tables.append(decoded.table)
        n_rows += decoded.table.shape[0]
        line += decoded.n_lines
    for clock in clocks:
        clock.finish()
    if keep and tables:
        scan.table = (
            np.concatenate(tables)[: scan.n_rows] if tables[1:] else tables[0][: scan.n_rows]
        )
    return scan


def _feed(scan: Scan, decoded: Decoded, clock_of: tuple[int | None, ...]) -> None:
    n_clocks = len(scan.clocks)
    for k, clock in enumerate(scan.clocks):
        clock.feed(decoded.table[:, k])
    for k, (channel, of) in enumerate(zip(scan.ranges, clock_of, strict=True)):
        counted = decoded.table[:, of] if of is not None else None
        channel.feed(decoded.table[:, n_clocks + k], counted)


def _note_damage(scan: Scan, decoded: Decoded, n_rows: int, line: int) -> None:
    held = np.flatnonzero(np.isfinite(decoded.table).any(axis=1))
    if held.size:
        scan.n_rows = n_rows + int(held[-1]) + 1
    scan.skipped += [(row + n_rows, at + line, text) for row, at, text in decoded.skipped]
    if scan.first_missing is None and decoded.first_missing is not None:
        scan.first_missing = decoded.first_missing + line
