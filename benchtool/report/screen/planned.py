"""What to record, and what to expect of it."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from rich.console import Console

from benchtool.model.design import Design
from benchtool.model.plan import PlannedQuantity, ProbeShift, Risks, StagePlan
from benchtool.report.commands import quoted
from benchtool.report.screen.blocks import (
    draw_heading,
    draw_line,
    draw_next,
    draw_notices,
    draw_rows,
)
from benchtool.units import format_value

_HARMLESS = 1e-3  # relative shift by a probe
_NONE = 1e-9
_REPEATS = {
    "period": " on the nominal board",
    "pulse": "; a trigger every two pulse lengths",
    "delay": "; one to each power-up",
}
_SOURCES = {
    "assumed jitter": "the jitter that is assumed of one interval",
    "scatter": "the scatter of the periods",
    "grid": "the sampling interval",
    "timebase": "the timebase",
    "edge noise": "noise on the edges",
    "level": "the reference level",
    "thresholds and IC": "the spread of the IC",
}


def draw_plans(console: Console, design: Design, plans: Sequence[StagePlan]) -> None:
    """Draw a block a stage: what to record, what to expect, what the rule does."""
    draw_heading(console, design.name, design.source)
    for plan in plans:
        console.print()
        draw_line(console, f"stage {plan.stage}, {plan.topology}: before you measure", "bold")
        console.print()
        draw_line(console, _advice(plan), "bold")
        console.print()
        draw_rows(console, _record_rows(plan))
        _draw_expected(console, plan)
        console.print()
        draw_rows(console, _answers(plan, design))
        console.print()
        draw_notices(console, plan.warnings)
    last = plans[0]
    span = format_value(last.span_s, "s", 3).replace(" ", "")
    rate = format_value(last.rate_hz, "Hz", 3).replace(" ", "")
    command = f"benchtool simulate {quoted(design.source)} --stage {quoted(last.stage)}"
    draw_next(console, f"{command} --rate {rate} --duration {span} -o trial.csv")


def _counted(n: int, unit: str) -> str:
    return f"{n:,} {unit}{'' if n == 1 else 's'}"


def _advice(plan: StagePlan) -> str:
    """Return one sentence to act on."""
    start = (
        f"Record {plan.channel or 'the output'} for {format_value(plan.span_s, 's', 4)} at "
        f"{format_value(plan.rate_hz, 'Hz', 3)}"
    )
    needed = plan.repetition
    if any(item.n == 0 for item in plan.quantities):
        least = (
            format_value(2 * plan.unit_s, "s", 3) if plan.unit == "period" else "a longer record"
        )
        return f"So short a record may hold nothing whole; give the board more than {least}."
    if plan.n < needed.n:
        return f"{start} is too little: {needed.n:,} whole {plan.unit}s are needed."
    if not needed.enough:
        return f"{start}; {needed.quantity} will have little room, and more would not help."
    return f"{start}: that is enough for everything that is judged."


def _record_rows(plan: StagePlan) -> Iterator[tuple[str, str]]:
    channel = f"the output, channel {plan.channel}" if plan.channel else "the output"
    yield "record", channel
    given = "as given" if plan.rate_given else "recommended"
    yield "rate", f"{format_value(plan.rate_hz, 'Hz', 3)}, {given}"
    given = "as given" if plan.span_given else "recommended"
    if not plan.span_given and plan.span_s == plan.time_per_board_s:
        given = "all the time there is"
    wherever = ", wherever it begins" if plan.unit == "period" else ""
    holds = f"sure to hold {_counted(plan.n, 'whole ' + plan.unit)}{wherever}"
    yield "span", f"{format_value(plan.span_s, 's', 4)}, {given}: {holds}"
    yield f"one {plan.unit}", f"{format_value(plan.unit_s, 's', 4)}{_REPEATS[plan.unit]}"


def _draw_expected(console: Console, plan: StagePlan) -> None:
    if not plan.quantities:
        return
    console.print()
    heads = ("", "nominal", "U to expect", "from", "room", "undecided", "good rejected")
    draw_rows(console, [_expected_row(item) for item in plan.quantities], heads=heads)
    draw_line(
        console,
        "room: half the distance between the limits over U, 4 or more is comfortable; good "
        "rejected: share of the boards inside the limits that the guard band does not pass",
        "dim",
    )


def _expected_row(item: PlannedQuantity) -> tuple[str, ...]:
    room = "" if item.room is None else f"{item.room:.3g} U"
    risks = item.risks
    return (
        item.quantity,
        format_value(item.nominal, item.unit, 4),
        "none" if item.U is None else f"± {format_value(item.U, item.unit, 2)}",
        f"n = {item.n:,}",
        room,
        _undecided(item),
        "" if risks is None else share_text(risks.good_not_accepted),
    )


def _undecided(item: PlannedQuantity) -> str:
    if item.n == 0 and (item.lower is not None or item.upper is not None):
        return "all"
    return "" if item.risks is None else share_text(item.risks.undecided)


def share_text(share: float | None) -> str:
    """Return a share in percent; what is nearly none or nearly all is never rounded to it."""
    if share is None:
        return "–"
    if share in (0.0, 1.0):
        return f"{100 * share:.0f} %"
    if share < 5e-5:
        return "< 0.01 %"
    if share > 0.9995:
        return "> 99.9 %"
    return f"{100 * share:.1f} %" if share >= 0.01 else f"{100 * share:.2g} %"


def change_text(share: float) -> str:
    """Return a relative change: "+5.4 %", "-31 %", "+164 %"."""
    if abs(share) < _NONE:
        return "0 %"
    return f"{100 * share:+.0f} %" if abs(share) >= 0.1 else f"{100 * share:+.2g} %"


def _answers(plan: StagePlan, design: Design) -> Iterator[tuple[str, str]]:
    yield "enough?", _enough(plan)
    if plan.time_per_board_s is not None and plan.n_in_time is not None:
        yield "time", _time(plan)
    if plan.board is not None:
        yield "boards", _boards(plan.board, plan.n_boards, design)
    yield "beware", _probe(plan.probe)


def _enough(plan: StagePlan) -> str:
    found = plan.repetition
    if found.quantity is None:
        return "Nothing is judged here, so any record is long enough."
    count = _counted(found.n, plan.unit)
    source = _SOURCES.get(found.dominant or "", found.dominant or "nothing")
    if found.enough:
        leaves = "leaves" if found.n == 1 else "leave"
        return (
            f"{count} {leaves} four to one on everything that is judged; {found.quantity} is the "
            f"narrowest, and most of its U is {source}."
        )
    return (
        f"Four to one on {found.quantity} is out of reach: from {count} on U no longer falls, and "
        f"most of it is {source}."
    )


def _time(plan: StagePlan) -> str:
    allowed = format_value(plan.time_per_board_s or 0.0, "s", 3)
    count = _counted(plan.n_in_time or 0, f"whole {plan.unit}")
    if (plan.n_in_time or 0) >= plan.repetition.n:
        return f"{allowed} a board are enough: they are sure to hold {count}."
    if not plan.n_in_time:
        return f"{allowed} a board are too short: they may hold no whole {plan.unit}."
    return f"{allowed} a board are sure to hold {count}, fewer than are needed."


def _boards(board: Risks, n_boards: int, design: Design) -> str:
    bad = (
        "no board outside the limits was among them"
        if board.bad_accepted is None
        else f"of those outside the limits {share_text(board.bad_accepted)} are accepted"
    )
    return (
        f"Of {n_boards:,} random boards with all parts inside their tolerances "
        f"{share_text(board.passing)} pass, {share_text(board.undecided)} stay undecided, "
        f"{share_text(board.failing)} fail (rule {design.rule.name}). Of those inside the limits "
        f"{share_text(board.good_not_accepted)} are not accepted; {bad} (JCGM 106:2012, 9.5)."
    )


def _probe(shift: ProbeShift) -> str:
    load = (
        f"{format_value(shift.probe.r_ohm, 'ohm', 3)} and {format_value(shift.probe.c_f, 'F', 3)}"
    )
    start = f"A probe of {load} at the capacitor"
    if shift.stops:
        return f"{start} stops the circuit: probe the output."
    worst = max((abs(value) for value in shift.shifts.values()), default=0.0)
    figures = ", ".join(
        f"{name} by {change_text(value)}"
        for name, value in shift.shifts.items()
        if name != "period"
    )
    if worst < _HARMLESS:
        return f"{start} shifts {figures}: it does no harm here."
    return f"{start} shifts {figures}: probe the output."
