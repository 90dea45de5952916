"""The last readings as a strip of characters, with the places where they moved."""

from __future__ import annotations

from benchtool.frozen import frozen_record
from benchtool.model.watch import Point
from benchtool.report.numberline import NumberLine
from benchtool.units import format_value

_LABEL = 12
_REST = 10  # readings without a movement that part one from the next
_GOAL_NEAR = 2.0  # spans of the readings beyond which the goal is not drawn


@frozen_record
class Strip:
    """Rows of a strip, and the column from which they belong to the present average."""

    rows: tuple[str, ...]
    since: int


def draw_strip(
    points: tuple[Point, ...],
    goal: float | None,
    unit: str,
    *,
    least_span: float,
    width: int,
    height: int,
) -> Strip:
    """Return the newest readings, the newest at the right; ``|`` where a movement begins.

    A reading is ``o``, one that moved ``*``.

    Args:
        points: The readings, oldest first.
        goal: The goal, drawn as a dotted line where it is near.
        unit: Unit of both.
        least_span: Between top and bottom, so that noise does not fill the strip.
        width: Columns.
        height: Rows, 2 or more.
    """
    shown = points[-max(1, width - _LABEL) :]
    if not shown:
        return Strip(rows=(), since=0)
    low, high = _ends([point.value for point in shown], goal, least_span)
    cells = [[" "] * len(shown) for _ in range(height)]
    if goal is not None and low <= goal <= high:
        cells[_row(goal, low, high, height)] = ["."] * len(shown)
    begins = _beginnings(shown)
    for column, point in enumerate(shown):
        if begins[column]:
            for row in cells:
                row[column] = "|"
        cells[_row(point.value, low, high, height)][column] = "*" if point.moved else "o"
    labels = {0: format_value(high, unit, 5), height - 1: format_value(low, unit, 5)}
    rows = (f"{labels.get(i, ''):>{_LABEL - 2}}  {''.join(row)}" for i, row in enumerate(cells))
    since = max((i for i, point in enumerate(shown) if point.moved), default=0)
    return Strip(rows=tuple(row.rstrip() for row in rows), since=_LABEL + since)


def _beginnings(points: tuple[Point, ...]) -> list[bool]:
    """Return where a movement begins: none of the few readings before it moved."""
    return [
        point.moved and not any(before.moved for before in points[max(0, i - _REST) : i])
        for i, point in enumerate(points)
    ]


def _ends(values: list[float], goal: float | None, least_span: float) -> tuple[float, float]:
    low, high = min(values), max(values)
    span = max(high - low, least_span) or 1e-4 * abs(high) or 1.0
    if goal is not None and low - _GOAL_NEAR * span <= goal <= high + _GOAL_NEAR * span:
        low, high = min(low, goal), max(high, goal)
    missing = max(0.0, span - (high - low)) / 2
    return low - missing, high + missing


def _row(value: float, low: float, high: float, height: int) -> int:
    """Return the row of a value, the greatest at the top."""
    share = (value - low) / (high - low)
    return min(height - 1, max(0, round((1 - share) * (height - 1))))


def draw_goal(line: NumberLine, goal: float, text: str, width: int) -> str:
    """Return a row below a number line that points at the goal."""
    place = line.place(goal)
    if not 0 <= place <= 1:
        return f"{'<-' if place < 0 else '->'} {text}".rjust(width if place > 1 else 0)
    at = round(place * (width - 1))
    right = f"^ {text}"
    if at + len(right) <= width:
        return " " * at + right
    return f"{text} ^".rjust(at + 1)
