"""Which part moved, how sure that is, and what to measure next."""

from __future__ import annotations

import shlex

from rich.console import Console
from rich.text import Text

from benchtool.model.diagnosis import Diagnosis, NextReading
from benchtool.model.picking import Combinations
from benchtool.model.result import Analysis, StageResult
from benchtool.report.commands import quoted, same_capture
from benchtool.report.compass import draw_compass
from benchtool.report.phrases import file_name
from benchtool.report.screen.blocks import (
    draw_cells,
    draw_heading,
    draw_line,
    draw_next,
    draw_notes,
    draw_rows,
)
from benchtool.report.screen.measured import trace_line, trace_title
from benchtool.report.screen.solved import draw_products
from benchtool.report.suspicion import (
    combination_rows,
    compass_points,
    group_text,
    next_heading,
    others_text,
    reading_cost,
    reading_title,
    shorter_caution,
    suspect_rows,
    unmarked_sentence,
)
from benchtool.units import format_value

_BAR = 12
_MOST_NEXT = 3
_COMPASS = (41, 13)


def draw_diagnosed(console: Console, analysis: Analysis) -> None:
    """Draw the answer, the suspects, the compass and what to measure next, a stage at a time."""
    for result in analysis.results:
        draw_heading(console, _title(analysis, result), file_name(analysis, result))
        draw_line(console, f"{trace_title(result)}: {trace_line(result)}", "dim")
        if result.diagnosis is not None:
            _draw_answer(console, result.diagnosis)
        if result.combinations is not None:
            _draw_unmarked(console, result, result.combinations)
        draw_notes(console, analysis, result)
    draw_next(console, _next_command(analysis))


def _title(analysis: Analysis, result: StageResult) -> str:
    if analysis.design is None:
        return "Board without a drawing or markings"
    return f"{analysis.design.name}  stage {result.stage}"


def _draw_unmarked(console: Console, result: StageResult, found: Combinations) -> None:
    console.print()
    draw_line(console, unmarked_sentence(found), "bold")
    draw_products(console, result, with_parts=False)
    console.print()
    draw_rows(console, combination_rows(found), heads=("parts that fit", "charge", "discharge"))


def _draw_answer(console: Console, found: Diagnosis) -> None:
    console.print()
    draw_line(console, found.sentence, "bold")
    console.print()
    _draw_suspects(console, found)
    _draw_compass(console, found)
    _draw_next_readings(console, found)


def _draw_suspects(console: Console, found: Diagnosis) -> None:
    rows = [
        (row.name, _bar(row.share), row.percent, row.meaning, row.size)
        for row in suspect_rows(found)
    ]
    draw_rows(console, rows, heads=("suspect", "", "likely", "what it is", "its size"))
    for words in (others_text(found), *map(group_text, found.groups)):
        if words:
            console.print()
            draw_line(console, words)


def _bar(share: float) -> str:
    filled = round(share * _BAR)
    return "#" * filled + "." * (_BAR - filled)


def _draw_compass(console: Console, found: Diagnosis) -> None:
    width, height = _COMPASS
    points = compass_points(found)
    if not points:
        return
    rows = draw_compass(points, width=width, height=height)
    console.print()
    draw_line(console, "Which way the times went: right, a longer high; up, a longer low", "dim")
    words = ["+  as designed", *(f"{point.letter}  {point.name}" for point in points)]
    for k in range(max(len(rows), len(words))):
        left = rows[k] if k < len(rows) else ""
        right = words[k] if k < len(words) else ""
        draw_cells(console, Text(f"{left:<{width + 3}}"), Text(right))


def _draw_next_readings(console: Console, found: Diagnosis) -> None:
    console.print()
    if not found.next:
        draw_line(console, found.stop or "Nothing cheap is left to measure.")
        return
    draw_line(console, next_heading(found), "bold")
    said: set[str] = set()
    for item in found.next[:_MOST_NEXT]:
        console.print()
        draw_line(console, f"{reading_title(item)}   {reading_cost(item)}")
        if item.caution:
            draw_line(
                console, f"Caution: {shorter_caution(item.caution, said)}", "yellow", deeper=2
            )
        draw_line(console, item.why, deeper=2)


def _next_command(analysis: Analysis) -> str:
    name = same_capture(analysis.sources[0])
    design = quoted(analysis.design.source) if analysis.design and analysis.design.source else ""
    base = f"benchtool diagnose {name}" + (f" --design {design}" if design else "")
    found = next((item.diagnosis for item in analysis.results if item.diagnosis), None)
    first = found.next[0] if found and found.next else None
    return f"{base} {_as_option(first)}" if first else f"benchtool explain {_best(found)}"


def _best(found: Diagnosis | None) -> str:
    return found.best.fault if found else "diagnose"


_AS_FILE = ("power-up", "probe-lifted", "node")
_WITH_VALUE = {
    "shunt": "--shunt",
    "added-capacitor": "--added-capacitor",
    "second-supply": "--supply",
}


def _as_option(item: NextReading) -> str:
    """Return the option that brings a reading, with a word where its result goes."""
    if item.reading in _AS_FILE:
        return f"--{item.reading} FILE"
    if item.reading in _WITH_VALUE:
        value = format_value(item.value or 0.0, item.unit).replace(" ", "")
        return f"{_WITH_VALUE[item.reading]} {shlex.quote(value)} FILE"
    return f"--reading {item.reading}=VALUE"
