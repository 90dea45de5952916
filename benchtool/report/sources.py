"""Where the figures of a document come from: its files, and how each was read."""

from __future__ import annotations

from typing import Any

from benchtool.model.capture import StructurePoint
from benchtool.model.kit import KitInstrument
from benchtool.model.result import Source

Json = dict[str, Any]


def source_document(item: Source) -> Json:
    """Return a file as JSON: how it was read, from what evidence, and which part of it."""
    window = item.window
    return {
        "role": item.role,
        "name": item.name,
        "sha256": item.sha256,
        "format": item.format,
        "structure": structure(item.structure),
        "evidence": [
            {"point": p.name, "value": p.value, "from": p.evidence, "sure": p.sure}
            for p in item.structure
        ],
        "window": None if window is None else {"from_s": window.from_s, "to_s": window.to_s},
    }


def structure(points: tuple[StructurePoint, ...]) -> dict[str, str]:
    """Return what was found of a file's structure, name to value."""
    return {point.name: point.value for point in points}


def instrument_document(item: KitInstrument) -> Json:
    """Return what the user's kit says of an instrument."""
    return {
        "name": item.name,
        "resource": item.resource,
        "dialect": item.dialect,
        "timebase_rel": item.timebase_rel,
        "calibration_due": item.calibration_due,
        "probe": item.probe and item.probe.name,
    }
