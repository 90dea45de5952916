"""One column of a delimited text, and what makes it a clock."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace
from typing import Literal

from benchtool.formats.text.cells import Kind
from benchtool.formats.text.metadata import Stated
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray

ClockKind = Literal["number", "stamp", "index"]


@frozen_record(eq=False)
class Column:
    """One field of the data rows.

    Attributes:
        field: Its index, from 0.
        name: Name, unit taken off; empty where the file gives none.
        unit: Unit as printed.
        raw: Header cell as printed.
        kind: What most of its cells are.
        head: Its first values, NaN where no number.
        date_only: Whether its cells are days, without a time of day.
        bit: The bit of its words that this channel is, None where its cells are no words.
        copy: Which of several channels of one name it is, from 1; None where the name is its own.
    """

    field: int
    name: str
    unit: str
    raw: str
    kind: Kind
    head: FloatArray
    date_only: bool = False
    bit: int | None = None
    copy: int | None = None

    @property
    def title(self) -> str:
        """The name, or ``column 2`` where there is none; ``OUT (2)`` for the second of a name."""
        title = self.name or f"column {self.field + 1}"
        title = title if self.copy is None else f"{title} ({self.copy})"
        return title if self.bit is None else f"{title}[{self.bit}]"


@frozen_record(eq=False)
class ClockColumn:
    """A column that gives time.

    Attributes:
        column: The column.
        kind: Numbers, calendar stamps, or a running number.
        date: Field of the date, where date and time of day stand apart.
        evidence: What it was recognised by.
    """

    column: Column
    kind: ClockKind
    evidence: str
    date: int | None = None


@frozen_record(eq=False)
class Columns:
    """Clocks and channels.

    Attributes:
        clocks: The clocks.
        values: The channels.
        clock_of: Each channel's clock, None where rows count.
        intervals: Sample intervals that stand in columns of their own.
        disordered: Columns named for time that do not go forward.
        axis: What the table is swept over, where that is no time; None where it is a capture.
        key: The column that tells which channel a row is of.
        dates: Days without a time of day.
        edges: Whether the two clocks are the times of rising and of falling edges.
        lasting: Whether the clock is how long each state lasted.
        rivals: Clocks side by side that run over different spans.
    """

    clocks: tuple[ClockColumn, ...]
    values: tuple[Column, ...]
    clock_of: tuple[int | None, ...]
    intervals: tuple[Stated, ...] = ()
    disordered: tuple[str, ...] = ()
    axis: Column | None = None
    key: Column | None = None
    dates: tuple[Column, ...] = ()
    edges: bool = False
    lasting: bool = False
    rivals: tuple[tuple[Column, Column], ...] = ()

    @property
    def counted(self) -> bool:
        """Whether rows are counted: there is no clock, or it is a running number."""
        return not self.clocks or any(clock.kind == "index" for clock in self.clocks)


def told_apart(channels: Iterable[Column]) -> tuple[Column, ...]:
    """Return channels whose names are their own: ``OUT (1)`` and ``OUT (2)`` for two ``OUT``."""
    channels = tuple(channels)
    fields: dict[str, list[int]] = {}  # not the channels: the bits of a word share its field
    for field, name in dict.fromkeys((c.field, c.name) for c in channels if c.name):
        fields.setdefault(name, []).append(field)
    several = {name: found for name, found in fields.items() if len(found) > 1}
    return tuple(
        replace(c, copy=several[c.name].index(c.field) + 1) if c.name in several else c
        for c in channels
    )
