"""How good the data are: what was counted, what was left out, what was seen and assumed."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from benchtool.model.quantity import Notice
from benchtool.model.result import Analysis, Finding, Gap, StageResult
from benchtool.report.page.views import Block, Facts, Note, Notes, Prose
from benchtool.units import format_value

_MOST_GAPS = 2


def quality_blocks(analysis: Analysis, result: StageResult) -> tuple[Block | None, ...]:
    """Return what was counted and dropped, the gaps, and every finding and warning.

    Args:
        analysis: The analysis, for the warnings that hold for all of it.
        result: One of its results.
    """
    rows = tuple(_counts(result))
    notes = _notes(analysis, result)
    quiet = Prose(text="Nothing was found to warn about.")
    return (Facts(rows=rows) if rows else None, Notes(notes=notes) if notes else quiet)


def _counts(result: StageResult) -> Iterable[tuple[str, str]]:
    if result.intervals is not None:
        counts = result.intervals
        yield "counted", f"{counts.high} high, {counts.low} low, {counts.period} periods"
        dropped = ", ".join(f"{item.count} {item.reason}" for item in counts.dropped)
        yield "left out", dropped or "nothing"
    if result.trace is not None:
        yield "gaps", _gaps(result.trace.gaps)


def _gaps(gaps: Sequence[Gap]) -> str:
    if not gaps:
        return "none"
    said = [
        f"{format_value(gap.end_s - gap.start_s, 's')} at {format_value(gap.start_s, 's')}"
        for gap in gaps[:_MOST_GAPS]
    ]
    more = [f"and {len(gaps) - _MOST_GAPS} more"] if len(gaps) > _MOST_GAPS else []
    return f"{len(gaps)}: {', '.join((*said, *more))}"


def _notes(analysis: Analysis, result: StageResult) -> tuple[Note, ...]:
    """Return the findings, then the warnings, of each code the first with a count of the rest."""
    findings = [Note(word="seen", text=_seen(item), code=item.code) for item in result.findings]
    warnings = [
        Note(word=_word(item.code), text=item.text, code=item.code)
        for item in _warnings(analysis, result)
    ]
    return tuple(_grouped([*findings, *warnings]))


def _seen(finding: Finding) -> str:
    causes = f" May be: {', '.join(finding.may_be)}." if finding.may_be else ""
    return finding.text + causes


def _word(code: str) -> str:
    return "assumed" if code.startswith("assumed-") else "note"


def _warnings(analysis: Analysis, result: StageResult) -> Iterable[Notice]:
    records = (analysis, result, result.levels, result.timing, result.jitter, result.solution)
    gathered = [
        notice
        for record in (*records, *result.checks)
        if record is not None
        for notice in record.warnings
    ]
    return dict.fromkeys(gathered)


def _grouped(notes: Iterable[Note]) -> Iterable[Note]:
    groups: dict[tuple[str, str], list[Note]] = {}
    for note in notes:
        groups.setdefault((note.word, note.code), []).append(note)
    for first, *others in groups.values():
        more = f" (and {len(others)} more of this kind)" if others else ""
        yield Note(word=first.word, text=first.text + more, code=first.code)
