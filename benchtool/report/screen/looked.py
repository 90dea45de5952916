"""What a file holds and how it was read."""

from __future__ import annotations

import math
import shlex

from rich.console import Console

from benchtool.model.capture import StructurePoint
from benchtool.model.result import Analysis, StageResult
from benchtool.report.commands import same_capture
from benchtool.report.screen.blocks import (
    draw_heading,
    draw_line,
    draw_next,
    draw_notes,
    draw_rows,
)
from benchtool.report.screen.measured import trace_line
from benchtool.units import format_value

_NAMES = {"time_unit": "unit of time"}
_DIGITS = 9


def draw_looked(console: Console, analysis: Analysis) -> None:
    """Draw the structure with its evidence, then a row a trace."""
    for index, source in enumerate(analysis.sources):
        draw_heading(console, f"read as {source.format}", source.name)
        console.print()
        rows = [_row(point) for point in source.structure]
        draw_rows(console, rows, heads=("structure", "found", "how sure", "from"))
        console.print()
        for result in analysis.results:
            if result.source == index:
                _draw_trace(console, result)
    draw_notes(console, analysis)
    draw_next(console, _next_command(analysis))


def _row(point: StructurePoint) -> tuple[str, str, str, str]:
    name = _NAMES.get(point.name, point.name)
    return name, _legible(point.value), point.sure, point.evidence


def _legible(value: str) -> str:
    """Return a value in plain seconds with its prefix, anything else as it is."""
    number, _, unit = value.partition(" ")
    try:
        return format_value(float(number), "s", _DIGITS) if unit == "s" else value
    except ValueError:
        return value


def _draw_trace(console: Console, result: StageResult) -> None:
    trace = result.trace
    if trace is None:
        return
    draw_line(console, f"{trace.channel}: {trace.role}", "bold")
    draw_line(console, trace_line(result), "dim", deeper=2)
    for line in (_levels_line(result), _gaps_line(result)):
        if line:
            draw_line(console, line, deeper=2)
    for notice in result.warnings:
        draw_line(console, f"{notice.text}  [{notice.code}]", "yellow", deeper=2)


def _levels_line(result: StageResult) -> str:
    levels = result.levels
    if levels is None or levels.kind in {"flat", "noise"}:
        return "" if levels is None else f"{levels.kind} at {format_value(levels.low_v, 'V')}"
    places = max(0, 2 - math.floor(math.log10(levels.high_v - levels.low_v)))
    low, high, mid = (
        f"{volts:z.{places}f} V" for volts in (levels.low_v, levels.high_v, levels.mid_v)
    )
    words = "turns at" if levels.kind == "node" else "levels"
    return f"{words} {low} and {high}, edges taken at {mid}"


def _gaps_line(result: StageResult) -> str:
    gaps = result.trace.gaps if result.trace else ()
    if not gaps:
        return ""
    first = format_value(gaps[0].start_s, "s")
    return f"{len(gaps)} gap{'s' if len(gaps) > 1 else ''}, the first at {first}"


def _next_command(analysis: Analysis) -> str:
    name = same_capture(analysis.sources[0])
    counts = [r.intervals for r in analysis.results if r.intervals]
    if not any(count.high or count.low for count in counts):
        return "benchtool explain no-interval"
    first = [r for r in analysis.results if r.source == 0]
    outputs = [r for r in first if r.trace and r.trace.role == "output"]
    if len(outputs) > 1 and outputs[0].trace is not None:
        return f"benchtool measure {name} --channel {shlex.quote(outputs[0].trace.channel)}"
    return f"benchtool measure {name}"
