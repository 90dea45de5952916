"""From an analysis to the page that shows it."""

from __future__ import annotations

from collections.abc import Iterable

from benchtool.model.result import Analysis, StageResult
from benchtool.report.counting import TITLE
from benchtool.report.page.cautions import CAUTIONS
from benchtool.report.page.circuit import circuit_blocks
from benchtool.report.page.facts import condition_facts
from benchtool.report.page.provenance import provenance_blocks
from benchtool.report.page.quality import quality_blocks
from benchtool.report.page.quantities import number_lines, quantity_grid
from benchtool.report.page.rules import rule_text
from benchtool.report.page.suspects import compass_blocks, next_blocks, suspect_blocks
from benchtool.report.page.verdicts import board_verdict, result_verdict
from benchtool.report.page.views import (
    Block,
    Command,
    Facts,
    Grid,
    Lines,
    Page,
    Pictures,
    Prose,
    Section,
    Sheet,
    Stamp,
)
from benchtool.report.phrases import file_name

MOST_SHEETS = 64
"""Traces shown of a capture with more of them; the rest are counted."""

_NO_FILE = "Figures as given"
_MADE = {
    "look": "looked at",
    "measure": "measured",
    "solve": "solved",
    "judge": "judged",
    "diagnose": "diagnosed",
}


def build_page(analysis: Analysis, stamp: Stamp) -> Page:
    """Return all that the report on an analysis shows, in order.

    Args:
        analysis: What was found.
        stamp: Version, time and command.
    """
    made = _MADE.get(analysis.command, "made")
    return Page(
        title=_title(analysis),
        subtitle=_subtitle(analysis),
        source=", ".join(item.name for item in analysis.sources) or _NO_FILE,
        made=f"{made} {stamp.made_at} by benchtool {stamp.version}",
        verdict=board_verdict(analysis),
        sheets=tuple(_sheet(analysis, item) for item in analysis.results[:MOST_SHEETS]),
        closing=tuple(_closing(analysis, stamp)),
    )


def _title(analysis: Analysis) -> str:
    if analysis.design is not None:
        return analysis.design.name
    if len(analysis.sources) > 1:
        return f"{len(analysis.sources)} captures"
    return analysis.sources[0].name if analysis.sources else _NO_FILE


def _subtitle(analysis: Analysis) -> str:
    design = analysis.design
    words = []
    if design is not None:
        words = [design.assembly or "", f"rev {design.revision}" if design.revision else ""]
    if len(analysis.results) == 1 and analysis.results[0].stage:
        words.append(f"stage {analysis.results[0].stage}")
    return " · ".join(word for word in words if word)


def _sheet(analysis: Analysis, result: StageResult) -> Sheet:
    return Sheet(
        title=_sheet_title(analysis, result),
        verdict=result_verdict(analysis, result),
        sections=tuple(_sections(analysis, result)),
    )


def _sheet_title(analysis: Analysis, result: StageResult) -> str:
    several = len(analysis.results) > 1  # of one alone the head of the page says the stage
    words = [f"stage {result.stage}" if result.stage and several else ""]
    if result.counted is not None:
        words.append(f"{TITLE} of input {result.counted.channel}")
    if result.trace is not None:
        words.append(f"{result.trace.role} on {result.trace.channel}")
    if len(analysis.sources) > 1:
        words.append(file_name(analysis, result))
    return " · ".join(word for word in words if word)


def _sections(analysis: Analysis, result: StageResult) -> Iterable[Section]:
    """Yield what is said of one result; what it does not hold is left out."""
    parts: tuple[tuple[str, str, tuple[Block | None, ...]], ...] = (
        ("suspects", "Suspects", suspect_blocks(result.diagnosis)),
        ("compass", "Which way the times went", compass_blocks(result.diagnosis)),
        ("next", "What to measure next", next_blocks(result.diagnosis)),
        ("quantities", "Quantities", (quantity_grid(result, command=analysis.command),)),
        ("lines", "Against the limits", (number_lines(result),)),
        ("circuit", "What the numbers imply", circuit_blocks(result)),
        ("pictures", "Pictures", (_pictures(result),)),
        ("conditions", "Conditions", (condition_facts(analysis, result),)),
        ("quality", "Data quality", quality_blocks(analysis, result)),
    )
    for key, title, blocks in parts:
        present = tuple(block for block in blocks if block is not None)
        if present:
            yield Section(key=key, title=title, blocks=present)


def _pictures(result: StageResult) -> Pictures | None:
    return None if result.overview is None else Pictures(result=result)


def _closing(analysis: Analysis, stamp: Stamp) -> Iterable[Section]:
    left_out = len(analysis.results) - MOST_SHEETS
    if left_out > 0:
        text = f"{left_out} more traces are left out here; the JSON document holds them all."
        yield _section("more", "More traces", Prose(text=text))
    yield Section(
        key="traceability", title="Traceability", blocks=provenance_blocks(analysis, stamp)
    )
    rule = rule_text(analysis.rule) if analysis.rule else "No limits were given, so none was used."
    yield _section("rule", "Decision rule", Prose(text=rule))
    yield _section("cautions", "Before touching the board", Prose(text=CAUTIONS))
    yield _section("command", "To repeat this", Command(text=stamp.command_line))


def _section(key: str, title: str, block: Prose | Facts | Grid | Lines | Command) -> Section:
    return Section(key=key, title=title, blocks=(block,))
