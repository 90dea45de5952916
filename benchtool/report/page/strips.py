"""Number lines and pictures in plain characters, for pages without pictures."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace

import numpy as np

from benchtool.model.arrays import FloatArray
from benchtool.model.overview import Overview
from benchtool.model.result import StageResult
from benchtool.report.compass import Point, draw_compass
from benchtool.report.numberline import draw_line
from benchtool.report.page.geometry import off_line
from benchtool.report.page.views import Line
from benchtool.report.text import printable
from benchtool.units import format_value

WIDTH = 76
_LABEL = 10  # of what stands left of a picture
_COLUMNS = WIDTH - _LABEL - 2
_NAME = 22  # of what stands left of a number line
_LINE = 40


BAR_HEADS = ("suspect", "likely", "what it is", "its size")
_COMPASS = (41, 13)


def compass_rows(points: Sequence[Point]) -> list[str]:
    """Return the compass as rows of characters, with what stands in it."""
    width, height = _COMPASS
    legend = "   ".join(f"{point.letter} {point.name}" for point in points)
    return [*draw_compass(points, width=width, height=height), "", f"+ as designed   {legend}"]


def line_rows(lines: Iterable[Line]) -> list[str]:
    """Return a row of characters for each number line: name, line, verdict."""
    return [f"{line.label:<{_NAME}} {_drawn(line)} {line.verdict}" for line in lines]


def _drawn(line: Line) -> str:
    """Return the line; a bound that leaves nothing on it is drawn like a value off it."""
    scale = line.scale
    if scale.value is None and off_line(line) is not None:
        scale = replace(scale, value=line.at_most if line.at_least is None else line.at_least)
    return draw_line(scale, _LINE)


def picture_rows(result: StageResult) -> list[str]:
    """Return the pictures of a result as rows of characters; empty where there are none.

    Args:
        result: One result, drawn from its overview.
    """
    overview = result.overview
    if overview is None:
        return []
    rows = (
        _trace(overview, "V" if _is_waveform(result) else "")
        if overview.envelope_s.size > 1
        else []
    )
    if overview.periods_s.size > 1:
        rows += [*_gap(rows), *_histogram(overview), *_over_time(overview)]
    return rows


def _gap(rows: list[str]) -> list[str]:
    return [""] if rows else []


def _is_waveform(result: StageResult) -> bool:
    return result.trace is None or result.trace.kind == "waveform"


def _trace(overview: Overview, unit: str) -> list[str]:
    """Draw the envelope as an outline, with the edges marked below it."""
    low, high = overview.envelope_low_v, overview.envelope_high_v
    bottom, top = float(np.nanmin(low)), float(np.nanmax(high))
    grid = _Grid(rows=6, low=bottom, high=top)
    start_s, end_s = float(overview.envelope_s[0]), float(overview.envelope_s[-1])
    columns = _columns(overview.envelope_s, start_s, end_s)
    for column in range(_COLUMNS):
        inside = columns == column
        if inside.any() and np.isfinite(low[inside]).any():
            grid.fill(column, float(np.nanmin(low[inside])), float(np.nanmax(high[inside])))
    marks = [" "] * _COLUMNS
    for column in _columns(overview.edges_s, start_s, end_s):
        if 0 <= column < _COLUMNS:
            marks[column] = "^"
    ends = (_figure(top, unit), _figure(bottom, unit)) if unit else ("high", "low")
    return [
        "The first cycles; ^ marks an edge",
        *grid.lines(*ends),
        _labelled("", "".join(marks)),
        _axis(format_value(start_s, "s"), format_value(end_s, "s")),
    ]


def _histogram(overview: Overview) -> list[str]:
    count, limits_s = overview.histogram_count, overview.histogram_s
    if not count.size:  # equal periods have none
        return []
    grid = _Grid(rows=5, low=0.0, high=float(count.max()) or 1.0)
    for column in range(_COLUMNS):
        taken = float(count[column * count.size // _COLUMNS])
        if taken:
            grid.fill(column, 0.0, taken, char="#")
    return [
        "Histogram of the periods",
        *grid.lines(f"{count.max():g}", "0"),
        _axis(format_value(float(limits_s[0]), "s", 6), format_value(float(limits_s[-1]), "s", 6)),
        "",
    ]


def _over_time(overview: Overview) -> list[str]:
    periods_s, at_s = overview.periods_s, overview.periods_at_s
    grid = _Grid(rows=5, low=float(periods_s.min()), high=float(periods_s.max()))
    for column, period_s in zip(_columns(at_s, at_s[0], at_s[-1]), periods_s, strict=True):
        grid.fill(int(column), float(period_s), float(period_s), char="o")
    top, bottom = (format_value(float(x), "s", 6) for x in (periods_s.max(), periods_s.min()))
    return [
        "Periods over time",
        *grid.lines(top, bottom),
        _axis(format_value(float(at_s[0]), "s"), format_value(float(at_s[-1]), "s")),
    ]


class _Grid:
    """Rows of cells between two values, the highest on top."""

    def __init__(self, *, rows: int, low: float, high: float) -> None:
        self._low, self._span = low, (high - low) or 1.0
        self._cells = [[" "] * _COLUMNS for _ in range(rows)]

    def _row(self, value: float) -> int:
        last = len(self._cells) - 1
        return last - min(last, max(0, round((value - self._low) / self._span * last)))

    def fill(self, column: int, low: float, high: float, char: str = "") -> None:
        """Fill a column between two values; without a ``char``, as an outline."""
        top, bottom = self._row(high), self._row(low)
        for row in range(top, bottom + 1):
            self._cells[row][column] = char or ("|" if bottom > top else "-")

    def lines(self, top: str, bottom: str) -> list[str]:
        """Return the rows with the figures of the two ends."""
        labels = [top, *[""] * (len(self._cells) - 2), bottom]
        return [
            _labelled(label, "".join(row)) for label, row in zip(labels, self._cells, strict=True)
        ]


def _columns(times_s: FloatArray, start_s: float, end_s: float) -> FloatArray:
    """Return the column of each time, as whole numbers."""
    position = (times_s - start_s) / ((end_s - start_s) or 1.0)
    return np.round(position * (_COLUMNS - 1)).astype(int)


def _figure(value: float, unit: str) -> str:
    return format_value(value, unit, 3)


def _labelled(label: str, cells: str) -> str:
    return f"{printable(label):>{_LABEL}}  {cells}".rstrip()


def _axis(left: str, right: str) -> str:
    return _labelled("", f"{left}{right:>{_COLUMNS - len(left)}}")
