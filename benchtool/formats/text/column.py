"""One column of a delimited text, and what makes it a clock."""

from __future__ import annotations

from typing import Literal

from benchtool.formats.text.cells import Kind
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
    """

    field: int
    name: str
    unit: str
    raw: str
    kind: Kind
    head: FloatArray
    date_only: bool = False
    bit: int | None = None

    @property
    def title(self) -> str:
        """The name, or ``column 2`` where there is none."""
        title = self.name or f"column {self.field + 1}"
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
