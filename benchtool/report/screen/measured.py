"""The figures of a measurement."""

from __future__ import annotations

from rich.console import Console

from benchtool.model.quantity import Measured, Quantity
from benchtool.model.result import Analysis, StageResult
from benchtool.model.timing import Jitter, Timing
from benchtool.report.commands import same_capture
from benchtool.report.counting import TITLE, readings_line
from benchtool.report.phrases import file_name, gloss, quantity_text
from benchtool.report.screen.blocks import (
    draw_heading,
    draw_line,
    draw_next,
    draw_notes,
    draw_rows,
)
from benchtool.report.screen.budgets import draw_budgets, draw_changes
from benchtool.units import format_value

_TIMING = ("t_high", "t_low", "period", "frequency", "duty", "first_high", "delay", "drift")
_EVEN = (0.45, 0.505)  # duty of a circuit that charges and discharges through one resistor
_JITTER = ("period_sd", "period_pp", "cycle_rms", "cycle_peak", "grid_share")


def draw_measured(console: Console, analysis: Analysis, *, budget: bool = False) -> None:
    """Draw timing and jitter of every trace that was measured, with the budgets where wanted."""
    for result in analysis.results:
        draw_heading(console, trace_title(result), file_name(analysis, result))
        draw_line(console, trace_line(result), "dim")
        console.print()
        draw_timing(console, result)
        draw_changes(console, result)
        if budget:
            draw_budgets(console, result)
        draw_notes(console, analysis, result)
    name = same_capture(analysis.sources[0])
    draw_next(console, f"benchtool solve {name} --topology {_topology(analysis.results[0])}")


def _topology(result: StageResult) -> str:
    """Return a topology that can give such times, to try first."""
    duty = result.timing.duty if result.timing else None
    if not isinstance(duty, Measured) or duty.value < _EVEN[0]:
        return "one-shot"
    return "output-fed" if duty.value <= _EVEN[1] else "astable"


def draw_timing(console: Console, result: StageResult) -> None:
    """Draw the rows of timing and jitter; a quantity that the trace has not is left out."""
    rows = [*_rows(result.timing, _TIMING), *_rows(result.jitter, _JITTER)]
    draw_rows(console, rows)


def _rows(record: Timing | Jitter | None, names: tuple[str, ...]) -> list[tuple[str, str, str]]:
    figures: list[tuple[str, Quantity | None]] = [
        (name, getattr(record, name, None)) for name in names
    ]
    return [
        (name, gloss(name), quantity_text(figure)) for name, figure in figures if figure is not None
    ]


def trace_title(result: StageResult) -> str:
    """Return what the trace is: "output on CH1"."""
    if result.counted is not None:
        return f"{TITLE} of input {result.counted.channel}"
    if result.trace is None:
        return "figures as given"
    return f"{result.trace.role} on {result.trace.channel}"


def trace_line(result: StageResult) -> str:
    """Return one line about the record: kind, samples, span, whole periods."""
    if result.counted is not None:
        return readings_line(result.counted)
    trace = result.trace
    if trace is None:
        return "no capture behind them"
    words: list[str] = [trace.kind]
    if trace.samples is not None:
        spacing = trace.sample_interval_s
        every = f" at {format_value(spacing, 's')}" if spacing else ""
        words.append(f"{trace.samples} samples{every}")
    elif trace.tick_s:
        words.append(f"tick {format_value(trace.tick_s, 's')}")
    words.append(f"{format_value(trace.duration_s, 's')}")
    if result.intervals is not None:
        n = result.intervals.period
        words.append(f"{n} whole period{'' if n == 1 else 's'}")
    return ", ".join(words)
