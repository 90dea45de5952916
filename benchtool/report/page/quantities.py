"""The table of quantities, and the number lines of those that have limits."""

from __future__ import annotations

from collections.abc import Iterable

from benchtool.frozen import frozen_record
from benchtool.model.judgement import Check, VerdictName
from benchtool.model.quantity import Bound, Measured, Quantity
from benchtool.model.result import StageResult
from benchtool.model.timing import Levels
from benchtool.report.page.views import Grid, Line, Lines
from benchtool.report.phrases import (
    LABELS,
    check_line,
    conform_text,
    limits_text,
    quantity_text,
    room_text,
)
from benchtool.uncertainty import expanded
from benchtool.units import format_value

_TIMING = ("t_high", "t_low", "period", "frequency", "duty", "first_high", "delay", "drift")
_JITTER = ("period_sd", "period_pp", "cycle_rms", "cycle_peak", "grid_share")
_CHECK_NAMES = {"period_sd": "jitter_period", "cycle_rms": "jitter_cycle"}
_DIGITS = 6
_FIGURE = "measured, ± U at 95 %"
_JUDGED = ("quantity", _FIGURE, "limits", "from", "room left", "conforms", "verdict")
_UNJUDGED = ("quantity", _FIGURE, "U, relative", "observations")


@frozen_record
class _Row:
    """One quantity of the table, with its verdict where it was checked."""

    name: str
    label: str
    cells: tuple[str, ...]
    verdict: VerdictName | None = None


def quantity_grid(result: StageResult, *, command: str) -> Grid | None:
    """Return the table of what was measured, checked quantities first; None where it is empty.

    Args:
        result: One result; its checks bring limits, room and conformance probability.
        command: The verb that made it: ``look`` tells levels, the others times.
    """
    if command == "look":
        return _level_grid(result.levels)
    checked = [_checked(check) for check in result.checks]
    names = {row.name for row in checked}
    others = [
        _Row(name=name, label=label, cells=_unchecked(figure, judged=bool(checked)))
        for name, label, figure in _figures(result)
        if _CHECK_NAMES.get(name, name) not in names
    ]
    return _grid([*checked, *others], judged=bool(checked))


def _grid(rows: list[_Row], *, judged: bool) -> Grid | None:
    if not rows:
        return None
    return Grid(
        caption="What was measured, with its expanded uncertainty",
        heads=_JUDGED if judged else _UNJUDGED,
        rows=tuple((row.label, *row.cells) for row in rows),
        names=tuple("" if row.name == row.label else row.name for row in rows),
        verdicts=tuple(row.verdict for row in rows) if judged else (),
        numeric=frozenset({1, 2, 4, 5} if judged else {1, 2, 3}),
    )


def _checked(check: Check) -> _Row:
    cells = (
        quantity_text(check.measured),
        limits_text(check.lower, check.upper, check.unit, _DIGITS),
        check.source,
        room_text(check),
        conform_text(check.p_conform),
        check.verdict,
    )
    label = LABELS.get(check.quantity, check.quantity)
    return _Row(name=check.quantity, label=label, cells=cells, verdict=check.verdict)


def _unchecked(figure: Quantity, *, judged: bool) -> tuple[str, ...]:
    if judged:
        return (quantity_text(figure), "none", "", "", "", "")
    if isinstance(figure, Bound):
        return (quantity_text(figure), "–", "–")
    return (quantity_text(figure), _relative(figure), str(figure.n))


def _relative(figure: Measured) -> str:
    return format_value(expanded(figure) / abs(figure.value), "1", 2) if figure.value else "–"


def _figures(result: StageResult) -> Iterable[tuple[str, str, Quantity]]:
    """Yield every figure that was timed, with its name and its name in words."""
    for record, names in ((result.timing, _TIMING), (result.jitter, _JITTER)):
        for name in names:
            figure = getattr(record, name, None)
            if figure is not None:
                yield name, LABELS[name], figure


def _level_grid(levels: Levels | None) -> Grid | None:
    """Return the state levels, or the one level of a trace without two."""
    if levels is None:
        return None
    low = Measured(value=levels.low_v, u=levels.u_low_v, unit="V")
    high = Measured(value=levels.high_v, u=levels.u_high_v, unit="V")
    one = levels.kind in {"flat", "noise"}
    pairs = [("mean level", low)] if one else [("low level", low), ("high level", high)]
    return Grid(
        caption="The levels of the trace",
        heads=("quantity", _FIGURE),
        rows=tuple((label, quantity_text(figure)) for label, figure in pairs),
    )


def number_lines(result: StageResult) -> Lines | None:
    """Return a number line for each check that has a limit; None where there is none.

    Args:
        result: One result.
    """
    lines = tuple(
        _line(check)
        for check in result.checks
        if check.lower is not None or check.upper is not None
    )
    return Lines(lines=lines) if lines else None


def _line(check: Check) -> Line:
    bound = check.measured if isinstance(check.measured, Bound) else None
    return Line(
        name=check.quantity,
        label=LABELS.get(check.quantity, check.quantity),
        value=quantity_text(check.measured),
        lower=_limit(check.lower, check.unit),
        upper=_limit(check.upper, check.unit),
        accepted=limits_text(check.accept_lower, check.accept_upper, check.unit, _DIGITS),
        verdict=check.verdict,
        scale=check_line(check),
        at_least=bound.at_least if bound else None,
        at_most=bound.at_most if bound else None,
    )


def _limit(limit: float | None, unit: str) -> str:
    return "" if limit is None else format_value(limit, unit, _DIGITS)
