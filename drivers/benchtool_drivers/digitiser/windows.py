"""Windows: the pieces that a long record is read in."""

from __future__ import annotations

from collections.abc import Iterator

from benchtool.frozen import frozen_record
from benchtool_drivers.dialect.records import ChunkKeys


@frozen_record
class Window:
    """A piece of a record: ``count`` samples from ``offset`` on, the ``n``-th piece, from 0."""

    offset: int
    count: int
    n: int


def plan_windows(n_points: int, most: int | None) -> Iterator[Window]:
    """Yield windows that cover a record.

    Args:
        n_points: Samples in the record.
        most: Most samples in one window; None for no limit.
    """
    step = most or n_points
    for n, offset in enumerate(range(0, n_points, step)):
        yield Window(offset=offset, count=min(step, n_points - offset), n=n)


def placeholders(window: Window, chunk: ChunkKeys, point_bytes: int) -> dict[str, int]:
    """Return what stands in place of the words between braces.

    Args:
        window: The piece.
        chunk: How pieces are numbered.
        point_bytes: Bytes of one point of the record, where pieces are numbered in bytes.
    """
    step = point_bytes if chunk.unit == "bytes" else 1
    start = chunk.first + window.offset * step
    count = window.count * step
    return {
        "start": start,
        "stop": start + count - (1 if chunk.inclusive else 0),
        "offset": start,
        "count": count,
        "n": chunk.first + window.n,
    }
