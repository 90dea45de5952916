"""What a page shows of a diagnosis: suspects, the compass, what to measure next."""

from __future__ import annotations

from collections.abc import Iterator

from benchtool.model.diagnosis import Diagnosis
from benchtool.report.page.views import Bars, Block, Compass, Facts, Prose
from benchtool.report.suspicion import (
    compass_points,
    group_text,
    others_text,
    reading_cost,
    reading_title,
    shorter_caution,
    suspect_rows,
)


def suspect_blocks(found: Diagnosis | None) -> tuple[Block, ...]:
    """Return the suspects with their bars, and what cannot be told apart."""
    if found is None:
        return ()
    words = (others_text(found), *map(group_text, found.groups))
    return (Bars(rows=suspect_rows(found)), *(Prose(text=text) for text in words if text))


def compass_blocks(found: Diagnosis | None) -> tuple[Block, ...]:
    """Return the compass; nothing where the board has no point in it."""
    if found is None:
        return ()
    points = compass_points(found)
    return (Compass(points=points),) if points else ()


def next_blocks(found: Diagnosis | None) -> tuple[Block, ...]:
    """Return what to measure next, each with its hazard first."""
    if found is None:
        return ()
    if not found.next:
        return (Prose(text=found.stop),) if found.stop else ()
    return (Facts(rows=tuple(_rows(found))),)


def _rows(found: Diagnosis) -> Iterator[tuple[str, str]]:
    heard: set[str] = set()
    for item in found.next[:3]:
        caution = f"Caution: {shorter_caution(item.caution, heard)}" if item.caution else ""
        said = (caution, f"Takes {reading_cost(item)}.", item.why)
        yield reading_title(item), " ".join(text for text in said if text)
