"""A number line in plain characters: limits, guard band, value and U.

``|`` limit, ``[ ]`` what is accepted after the guard band, ``o`` the value, ``( )`` its U;
``<`` or ``>`` at an end where the value lies off the line.
"""

from __future__ import annotations

import math

from benchtool.frozen import frozen_record

LEGEND = "| limit   [ ] accepted after the guard band   o value   ( ) its U   < > off the line"
_MARGIN = 0.25  # of the distance between the limits, shown beyond each


@frozen_record
class NumberLine:
    """What a number line shows, in one unit; None where there is none, one limit at least."""

    value: float | None
    U: float = 0.0
    lower: float | None = None
    upper: float | None = None
    accept_lower: float | None = None
    accept_upper: float | None = None

    def ends(self) -> tuple[float, float]:
        """Return the values at the ends of the line."""
        limits = [x for x in (self.lower, self.upper) if x is not None and math.isfinite(x)]
        if len(limits) == 2 and limits[0] < limits[1]:
            low, high = limits
        else:
            low, high = self._around(limits[0] if limits else 0.0)
        margin = (high - low) * _MARGIN
        return low - margin, high + margin

    def _around(self, limit: float) -> tuple[float, float]:
        """Return a range that shows a single limit and, where it is near enough, the value."""
        reach = abs(limit) or 1.0
        value = limit if self.value is None else self.value
        low, high = min(limit, value), max(limit, value)
        if high - low < 0.1 * reach:
            low, high = low - 0.1 * reach, high + 0.1 * reach
        return max(low, limit - 3 * reach), min(high, limit + 3 * reach)

    def place(self, x: float) -> float:
        """Return where ``x`` lies: 0 at the left end of the line, 1 at the right."""
        low, high = self.ends()
        return (x - low) / (high - low)


def draw_line(line: NumberLine, width: int) -> str:
    """Return the number line in ``width`` plain characters."""
    cells = [" "] * width
    _fill(cells, line, line.lower, line.upper, "-")
    if line.accept_lower is not None or line.accept_upper is not None:
        _fill(cells, line, line.accept_lower, line.accept_upper, "=")
    marks = ((line.accept_lower, "["), (line.accept_upper, "]"), (line.lower, "|"))
    for x, char in (*marks, (line.upper, "|")):
        _put(cells, line, x, char)
    _put_value(cells, line)
    return "".join(cells)


def _cell(line: NumberLine, x: float, width: int) -> int:
    """Return the cell of ``x``, -1 or ``width`` where it lies off the line."""
    position = min(max(line.place(x), -1.0), 2.0)
    return min(max(round(position * (width - 1)), -1), width)


def _fill(
    cells: list[str], line: NumberLine, low: float | None, high: float | None, char: str
) -> None:
    width = len(cells)
    start = 0 if low is None else max(0, _cell(line, low, width))
    stop = width - 1 if high is None else min(width - 1, _cell(line, high, width))
    for i in range(start, stop + 1):
        cells[i] = char


def _put(cells: list[str], line: NumberLine, x: float | None, char: str) -> None:
    if x is None or not math.isfinite(x):
        return
    cell = _cell(line, x, len(cells))
    if 0 <= cell < len(cells):
        cells[cell] = char


def _put_value(cells: list[str], line: NumberLine) -> None:
    if line.value is None:
        return
    width = len(cells)
    at = _cell(line, line.value, width)
    if not 0 <= at < width:
        cells[0 if at < 0 else -1] = "<" if at < 0 else ">"
        return
    reach = line.U if math.isfinite(line.U) else 0.0
    left, right = _cell(line, line.value - reach, width), _cell(line, line.value + reach, width)
    if left < at < right:
        _put(cells, line, line.value - reach, "(")
        _put(cells, line, line.value + reach, ")")
    cells[at] = "o"
