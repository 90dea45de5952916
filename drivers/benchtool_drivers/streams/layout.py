"""What the lines of a stream look like, and what their numbers mean."""

from __future__ import annotations

from typing import Literal

from benchtool.frozen import frozen_record

Column = Literal["seq", "time", "interval", "level", "skip"]

PS_HZ = 1e12
"""Ticks in a second where times are printed in a unit of time: they become whole picoseconds."""


@frozen_record
class Layout:
    """The form of a line.

    Attributes:
        name: Of the format or of the description.
        columns: What each field is.
        levels: Text of a level and its code: bit 0 the level, bit 1 set for a heartbeat.
        tick_hz: Ticks in a second.
        delimiter: Between the fields; a blank stands for any run of blanks.
        comment: What a line that holds no edge begins with; empty for none.
        header_lines: Lines at the very start that are passed over.
        padded: Whether blanks around a field are passed over.
        decimal: The decimal mark, where times are printed in a unit of time.
        unit_ticks: Ticks in one unit of a printed time; 1 where ticks are printed.
        wrap_bits: Width of the tick counter; 0 where it never starts again.
        seq_bits: Width of the sequence number; 0 where it never starts again.
        level_before: Whether a level is the one before the edge instead of the one after.
        first_level: Level after the first edge, where the lines give no level.
        heartbeat_s: Longest silence of a living device, None where nothing is promised.
        channel: Name of the signal.
        xor_sum: Whether lines end in a check sum.
    """

    name: str
    columns: tuple[Column, ...]
    tick_hz: float
    levels: tuple[tuple[bytes, int], ...] = ()
    delimiter: bytes = b","
    comment: bytes = b""
    header_lines: int = 0
    padded: bool = False
    decimal: bytes = b"."
    unit_ticks: int = 1
    wrap_bits: int = 0
    seq_bits: int = 0
    level_before: bool = False
    first_level: bool | None = None
    heartbeat_s: float | None = None
    channel: str = "OUT"
    xor_sum: bool = False

    @property
    def has_seq(self) -> bool:
        """Whether lines are numbered."""
        return "seq" in self.columns

    @property
    def has_interval(self) -> bool:
        """Whether lines give lengths instead of times."""
        return "interval" in self.columns

    @property
    def time_column(self) -> int:
        """Number of the field that gives time."""
        return self.columns.index("interval" if self.has_interval else "time")
