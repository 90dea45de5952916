"""What markings say."""

from __future__ import annotations

from collections.abc import Sequence

from rich.console import Console

from benchtool.model.marking import Marking
from benchtool.report.screen.blocks import draw_line, draw_next, draw_title
from benchtool.units import format_value


def draw_markings(console: Console, decoded: Sequence[tuple[str, Sequence[Marking]]]) -> None:
    """Draw every reading of every marking."""
    for text, readings in decoded:
        console.print()
        count = "" if len(readings) == 1 else f"{len(readings)} sound readings, the likeliest first"
        draw_title(console, text, "bold", count)
        for reading in readings:
            draw_line(console, f"{_headline(reading)}   ({reading.how})")
            for note in (reading.temperature_note, *reading.notes):
                if note:
                    draw_line(console, note, "dim", deeper=2)
    draw_next(console, "benchtool design new --help")


def _headline(item: Marking) -> str:
    words: list[str] = [item.kind]
    if item.value is not None:
        words.append(format_value(item.value, item.unit))
    if item.tolerance_rel is not None:
        words.append(_tolerance(*item.tolerance_rel))
    if item.temperature_code:
        words.append(item.temperature_code)
    if item.rated_voltage_v is not None:
        words.append(format_value(item.rated_voltage_v, "V"))
    if not item.preferred:
        words.append("not a preferred value")
    return "  ".join(words)


def _tolerance(lower_rel: float, upper_rel: float) -> str:
    if -lower_rel == upper_rel:
        return f"±{100 * upper_rel:g} %"
    return f"{100 * lower_rel:+g} % {100 * upper_rel:+g} %"
