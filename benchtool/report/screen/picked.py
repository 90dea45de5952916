"""What to fit."""

from __future__ import annotations

from rich.console import Console

from benchtool.model.picking import Candidate, Offer, Picked, Spread
from benchtool.report.commands import quoted
from benchtool.report.phrases import gloss
from benchtool.report.screen.blocks import (
    draw_heading,
    draw_line,
    draw_next,
    draw_notices,
    draw_rows,
)
from benchtool.report.screen.planned import change_text, share_text
from benchtool.units import format_value

_MOST = 8
_UNITS = {"duty": "1", "frequency": "Hz"}


def draw_picked(console: Console, picked: Picked, design: str | None) -> None:
    """Draw what to do, the candidates, what to check, and what a trim could hide."""
    draw_heading(console, _title(picked), design or "")
    draw_line(console, _there(picked), "dim")
    console.print()
    draw_line(console, _advice(picked), "bold")
    console.print()
    shown = picked.offers[:_MOST]
    rows = [_row(picked, rank, item) for rank, item in enumerate(shown, 1)]
    draw_rows(console, rows, heads=_heads(picked))
    if len(picked.offers) > _MOST:
        draw_line(console, f"and {len(picked.offers) - _MOST} more, worse ones (--json)", "dim")
    if picked.n_boards:
        draw_line(console, _shares(picked), "dim")
    console.print()
    draw_rows(console, [("check" if n == 0 else "", text) for n, text in enumerate(picked.checks)])
    if picked.warnings:
        console.print()
        draw_notices(console, picked.warnings)
    draw_next(console, _next(picked, design))


def _advice(picked: Picked) -> str:
    """Return one sentence to act on."""
    best = picked.offers[0]
    does = _deed(best.candidate, picked.unit)
    name = picked.ref or f"the {picked.kind}"
    if picked.moved_rel is not None:
        start = (
            f"{name} itself is {change_text(picked.moved_rel)} off its marking, outside its "
            f"tolerance: {does}; a part that has moved goes on moving"
        )
    elif best.candidate.action == "keep":
        start = f"Leave {name} as it is: nothing in these series does better"
    else:
        start = f"{does[0].upper()}{does[1:]}"
    share = best.outlook.p_pass if best.outlook else None
    return (
        f"{start}." if share is None else f"{start}. {share_text(share)} of the boards would pass."
    )


def _title(picked: Picked) -> str:
    wanted = format_value(picked.wanted, picked.unit, 4)
    if picked.aim is None:
        return f"{picked.kind}: from {format_value(picked.have.value, picked.unit)} to {wanted}"
    name, target = picked.aim
    figure = format_value(target, _UNITS.get(name, "s"), 4)
    return f"{picked.ref} for {gloss(name) or name} {figure}: {wanted} would do"


def _there(picked: Picked) -> str:
    change = change_text(picked.wanted / picked.have.value - 1)
    return f"there now: {_spread(picked.have, picked.unit)}, {picked.how}; wanted {change} of it"


def _spread(item: Spread, unit: str) -> str:
    value = format_value(item.value, unit)
    lower, upper = item.lower / item.value - 1, item.upper / item.value - 1
    if round(1000 * lower) == round(-1000 * upper):
        return f"{value} ± {format_value((upper - lower) / 2, '1', 2)}"
    return f"{value} {change_text(lower)} {change_text(upper)}"


def _heads(picked: Picked) -> tuple[str, ...]:
    if picked.aim is None:
        return ("", "fit", "gives", "u", "off")
    return ("", "fit", "gives", "off", picked.aim[0], "boards pass")


def _row(picked: Picked, rank: int, offer: Offer) -> tuple[str, ...]:
    candidate, outlook = offer.candidate, offer.outlook
    gives = _spread(candidate.result, picked.unit)
    start, off = (f"{rank}", _fit(candidate, picked.unit), gives), change_text(candidate.off_rel)
    if outlook is None or picked.aim is None:
        return (*start, format_value(candidate.u / candidate.result.value, "1", 2), off)
    name = picked.aim[0]
    value = outlook.nominal.get(name)
    figure = "stands still" if value is None else format_value(value, _UNITS.get(name, "s"), 4)
    return (*start, off, figure, share_text(outlook.p_pass))


def _fit(candidate: Candidate, unit: str) -> str:
    if candidate.added is None:
        return "nothing"
    words = {"replace": "instead", "parallel": "across it", "series": "in series"}
    value = format_value(candidate.added.value, unit)
    return f"{value} {words[candidate.action]}, {candidate.series}"


def _deed(candidate: Candidate, unit: str) -> str:
    if candidate.added is None:
        return "leave it"
    value = f"{format_value(candidate.added.value, unit)} ({candidate.series})"
    deeds = {
        "replace": f"replace it by {value}",
        "parallel": f"put {value} across it",
        "series": f"put {value} in series with it",
    }
    return deeds[candidate.action]


def _shares(picked: Picked) -> str:
    return (
        f"boards pass: share of {picked.n_boards:,} random boards, the other parts anywhere inside "
        "their tolerances, that pass every limit with the guard band of a planned capture"
    )


def _next(picked: Picked, design: str | None) -> str:
    if design is None:
        return "benchtool explain trim"
    undiagnosed = any(item.code == "find-the-cause-first" for item in picked.warnings)
    return f"benchtool {'diagnose' if undiagnosed else 'judge'} FILE --design {quoted(design)}"
