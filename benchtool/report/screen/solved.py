"""The products that the times give."""

from __future__ import annotations

from rich.console import Console
from rich.text import Text

from benchtool.model.judgement import PartEstimate, Solution
from benchtool.model.quantity import Quantity
from benchtool.model.result import Analysis, StageResult
from benchtool.report.commands import quoted, same_capture
from benchtool.report.phrases import file_name, product_names, quantity_text, ratio_text
from benchtool.report.screen.blocks import (
    draw_cells,
    draw_heading,
    draw_line,
    draw_next,
    draw_notes,
    draw_rows,
)
from benchtool.report.screen.measured import draw_timing, trace_line, trace_title
from benchtool.report.suspicion import early_rows
from benchtool.units import format_value

_WITHIN = {True: "within tolerance", False: "OUT OF TOLERANCE", None: "not decided"}


def draw_solved(console: Console, analysis: Analysis) -> None:
    """Draw the times and the products they give."""
    for result in analysis.results:
        of_trace = (
            "" if result.trace is None and result.counted is None else file_name(analysis, result)
        )
        draw_heading(console, f"{trace_title(result)}{_circuit(result)}", of_trace)
        draw_line(console, trace_line(result), "dim")
        console.print()
        if result.early is not None:
            draw_rows(console, early_rows(result.early))
        else:
            draw_timing(console, result)
        draw_products(console, result)
        draw_notes(console, analysis, result)
    if analysis.sources:
        design = analysis.design.source if analysis.design else "DESIGN.toml"
        command = f"benchtool judge {same_capture(analysis.sources[0])} --design {quoted(design)}"
    else:
        command = "benchtool explain tau_charge"
    draw_next(console, command)


def _circuit(result: StageResult) -> str:
    return f", solved as {result.solution.topology}" if result.solution else ""


def draw_products(console: Console, result: StageResult, *, with_parts: bool = True) -> None:
    """Draw the products, then part values with what each assumes."""
    solution = result.solution
    if solution is None:
        return
    console.print()
    draw_rows(console, _product_rows(solution))
    for part in solution.parts if with_parts else ():
        if part.estimate is not None:
            _draw_part(console, part)


def _product_rows(solution: Solution) -> list[tuple[str, str, str]]:
    charge, discharge = product_names(solution.topology)
    ratio = f"{charge} / {discharge}"
    rows: list[tuple[str, str, Quantity | None]] = [
        ("tau_charge", f"{charge} of the parts", solution.tau_charge),
        ("tau_discharge", f"{discharge} of the parts", solution.tau_discharge),
        ("tau_RA", "RA·C of the parts", solution.tau_RA),
        ("effective charge", "R·C that acts", solution.effective_charge),
        ("effective discharge", "R·C that acts", solution.effective_discharge),
    ]
    shown = [
        (name, label, quantity_text(figure)) for name, label, figure in rows if figure is not None
    ]
    if solution.tau_ratio is not None:
        shown.append(("tau_ratio", ratio, ratio_text(solution.tau_ratio)))
    return shown


def _draw_part(console: Console, part: PartEstimate) -> None:
    """Draw a part value, and below it what it assumes."""
    unit = part.estimate.unit if part.estimate else "1"
    nominal = f"marked {format_value(part.nominal, unit)}" if part.nominal else ""
    within = _WITHIN[part.within_tolerance] if part.nominal else ""
    change = f"{100 * part.change.value:+z.1f} %" if part.change else ""
    console.print()
    value = Text(f"{quantity_text(part.estimate)}   {nominal} {change} {within}".rstrip())
    draw_cells(console, Text(f"{part.ref:<4}", style="bold"), value)
    if part.assumes:
        assumed = Text(f"if {' and '.join(part.assumes)}", style="dim")
        draw_cells(console, Text(" " * 4), assumed)
