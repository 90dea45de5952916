"""The verdict on a board."""

from __future__ import annotations

from rich.console import Console
from rich.text import Text

from benchtool.model.judgement import Check
from benchtool.model.result import Analysis, StageResult
from benchtool.report.commands import quoted, same_capture
from benchtool.report.numberline import draw_line
from benchtool.report.phrases import (
    VERDICT_STYLES,
    check_line,
    conform_text,
    file_name,
    gloss,
    limits_text,
    quantity_text,
    room_text,
    verdict_sentence,
)
from benchtool.report.screen.blocks import (
    INDENT,
    draw_cells,
    draw_heading,
    draw_next,
    draw_notes,
    draw_verdict,
)
from benchtool.report.screen.blocks import draw_line as draw_words
from benchtool.report.screen.measured import trace_line, trace_title
from benchtool.report.screen.solved import draw_products

_NAME = 17
_VALUE = 34
_LINE = 60
_LEGEND = "| limit   [ ] accepted   o value   ( ) its U   < > off the line"


def draw_judged(console: Console, analysis: Analysis) -> None:
    """Draw verdict, checks and what they imply, a stage at a time."""
    for result in analysis.results:
        _draw_stage(console, analysis, result)
    draw_words(console, _LEGEND, "dim")
    if analysis.verdict is not None:  # again at the end, where a long screen leaves the eye
        console.print()
        style = VERDICT_STYLES[analysis.verdict]
        draw_words(console, f"The board: {analysis.verdict.upper()}", style)
    draw_next(console, _next_command(analysis))


def _draw_stage(console: Console, analysis: Analysis, result: StageResult) -> None:
    draw_heading(console, _title(analysis, result), file_name(analysis, result))
    draw_words(console, f"{trace_title(result)}: {trace_line(result)}", "dim")
    draw_verdict(console, result.verdict or "unusable", verdict_sentence(result))
    if result.likely:
        draw_words(console, result.likely)
    for check in result.checks:
        _draw_check(console, check, said=verdict_sentence(result))
    draw_products(console, result, with_parts=result.verdict != "pass")
    draw_notes(console, analysis, result)
    console.print()


def _title(analysis: Analysis, result: StageResult) -> str:
    design = analysis.design
    if design is None:
        return f"stage {result.stage}"
    words = [design.name, design.assembly or ""]
    if design.revision:
        words.append(f"rev {design.revision}")
    return "  ".join(word for word in (*words, f"stage {result.stage}") if word)


def _draw_check(console: Console, check: Check, *, said: str) -> None:
    """Draw one check: figures, limits, number line, and why unless it was ``said`` above."""
    console.print()
    draw_cells(
        console,
        Text(f"{check.quantity:<{_NAME}}", style="bold"),
        Text(f"{quantity_text(check.measured):<{_VALUE}}"),
        Text(check.verdict, style=VERDICT_STYLES[check.verdict]),
    )
    name = Text(f"{gloss(check.quantity):<{_NAME}}", style="dim")
    limits = limits_text(check.lower, check.upper, check.unit)
    draw_cells(console, name, Text(f"{limits}  ({check.source})", style="dim"))
    line = draw_line(check_line(check), min(console.width - 2 * INDENT - _NAME, _LINE))
    draw_cells(console, Text(" " * _NAME), Text(line.rstrip()))
    why = () if check.verdict == "pass" or check.reason == said else (check.reason,)
    for words in (*why, _odds(check)):
        if words:
            draw_cells(console, Text(" " * _NAME), Text(words, style="dim"))


def _odds(check: Check) -> str:
    """Return the room of a pass to the nearer limit, and the conformance probability."""
    words = []
    if room_text(check) != "–" and check.verdict == "pass":
        words.append(f"room {room_text(check)}")
    if check.p_conform is not None:
        words.append(f"conforms with probability {conform_text(check.p_conform)}")
    return ", ".join(words)


def _next_command(analysis: Analysis) -> str:
    name = same_capture(analysis.sources[0])
    design = quoted(analysis.design.source) if analysis.design else "DESIGN.toml"
    if analysis.verdict == "pass":
        return f"benchtool judge {name} --design {design} --report board.html"
    if analysis.verdict == "unusable" or not any(item.solution for item in analysis.results):
        return f"benchtool look {name}"
    return f"benchtool solve {name} --design {design}"
