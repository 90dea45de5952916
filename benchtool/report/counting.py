"""What is said of a counter's readings, which have no trace."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from benchtool.units import format_value

if TYPE_CHECKING:
    from benchtool.model.counted import Counted, Readings

TITLE = "counter readings"


def readings_line(counted: Counted) -> str:
    """Return one line about the readings: how many of what, what each is, the resolution."""
    words = [_told(name, item) for name, item in counted.readings.items()]
    words.append(f"resolution {format_value(counted.resolution_s, 's')}")
    return ", ".join(words)


def _told(name: str, item: Readings) -> str:
    n = item.values.size
    if item.per == "interval":
        return f"{n} {name}"
    gate = f"a gate of {format_value(item.gate_s, 's')}" if item.gate_s else "a gate"
    return f"{n} {name} over {gate}"


def counted_document(counted: Counted) -> dict[str, Any]:
    """Return what is said of the readings in JSON."""
    return {
        "channel": counted.channel,
        "dialect": counted.dialect,
        "resolution_s": counted.resolution_s,
        "readings": {
            name: {
                "n": int(item.values.size),
                "missing": item.n_missing,
                "per": item.per,
                "gate_s": item.gate_s,
                "follow_each_other": bool(item.chains),
            }
            for name, item in counted.readings.items()
        },
    }
