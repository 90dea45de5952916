"""What a dialect of kind "counter" says, as frozen records."""

from __future__ import annotations

from collections.abc import Mapping

from benchtool.frozen import frozen_record
from benchtool.model.counted import CountedName
from benchtool_drivers.dialect.records import AcquireKeys


@frozen_record
class FunctionKeys:
    """What a counter calls one of the quantities.

    Attributes:
        word: Its word, which stands for ``{function}`` in commands.
        unit: Unit of its readings; none where the dialect leaves it open.
        per: Whether a reading is one ``interval`` or an average over a ``gate``.
    """

    word: str
    unit: str
    per: str


@frozen_record
class TakeKeys:
    """How N readings are taken."""

    by: str
    configure: tuple[str, ...] = ()
    n: int = 100
    most: int = 10_000


@frozen_record
class FirstEdge:
    """A query for the direction of the first edge, and its answer where that edge rises."""

    query: str
    rising: str


@frozen_record
class StampKeys:
    """Time stamps of edges.

    Attributes:
        edges: ``both`` in turn, ``levels`` (a stamp and the level after it), ``rising`` or
            ``falling`` alone.
        first: Direction of the first of both, or the query that tells it.
        unit: ``s``, a part of it, or ``ticks`` of the resolution.
    """

    edges: str
    first: str | FirstEdge
    unit: str


@frozen_record
class GateKeys:
    """The gate: its query, its unit, and what is answered where each reading is one interval."""

    query: str
    unit: str
    single: str


@frozen_record
class ResolutionKeys:
    """The step in which a single interval can change: stated, or asked for."""

    s: float | None
    query: str
    unit: str


@frozen_record
class ReadingKeys:
    """How readings travel."""

    query: str
    wrap: str
    dtype: str
    order: str
    separator: str
    trailer: str
    missing: tuple[float, ...]
    padding: int = 0

    @property
    def is_text(self) -> bool:
        """Whether readings are printed numbers."""
        return self.wrap == "ascii"


@frozen_record
class CounterKeys:
    """What only a dialect of kind "counter" has."""

    functions: Mapping[CountedName, FunctionKeys]
    take: TakeKeys
    stamps: StampKeys | None
    gate: GateKeys | None
    resolution: ResolutionKeys
    acquire: AcquireKeys
    data: ReadingKeys
