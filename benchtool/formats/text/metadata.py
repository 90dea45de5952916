"""What the lines around the data say: interval, rate, units, instrument."""

from __future__ import annotations

from collections.abc import Iterable

from benchtool.formats.text.layout import Layout
from benchtool.formats.text.unitwords import TimeUnit
from benchtool.frozen import frozen_record


@frozen_record(eq=False)
class Stated:
    """A figure that the metadata state, and the words it was found in.

    Attributes:
        value: The figure, in seconds.
        evidence: The words.
        assumed_unit: Whether its unit had to be assumed.
        rounding: Half its last printed digit, relative to it.
    """

    value: float
    evidence: str
    assumed_unit: bool = False
    rounding: float = 0.0


@frozen_record(eq=False)
class Metadata:
    """What the lines around the data say.

    Attributes:
        intervals: Sample intervals in seconds, one a statement.
        time_unit: Unit of the time column.
        value_unit: Unit of the values.
        instrument: Name of the instrument.
        thinned: What the file says of samples that were left out, empty where nothing.
    """

    intervals: tuple[Stated, ...] = ()
    time_unit: tuple[TimeUnit, str] | None = None
    value_unit: tuple[str, str] | None = None
    instrument: str | None = None
    thinned: str = ""


def read_metadata(lines: Iterable[str], layout: Layout) -> Metadata:
    """Collect what ``lines`` (those around the data, comments among them) say."""
    told = tuple(line for line in lines if line.strip())
    if not told:
        return Metadata()
    from benchtool.formats.text.statements import collect  # plain captures say nothing

    return collect(told, layout)
