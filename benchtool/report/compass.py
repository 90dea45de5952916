"""The compass: which way high and low time went.

To the right the high time is longer, upwards the low time. Only directions count: every fault
stands on one circle, this board halfway to it.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence

from benchtool.frozen import frozen_record
from benchtool.model.diagnosis import Direction

BOARD = "this board"
KEY = "o this board   + as designed"
_MOST = 8
_LETTERS = "abcdefgh"
_BOARD_RADIUS = 0.5
_TOGETHER = math.cos(math.radians(6))  # faults nearer to each other than this share a letter


@frozen_record
class Point:
    """A point of the compass.

    Attributes:
        letter: What stands there: ``o`` for this board.
        name: Whose it is; several that lead the same way are named together.
        x: To the right, -1 to 1.
        y: Upwards, -1 to 1.
    """

    letter: str
    name: str
    x: float
    y: float


def place_directions(directions: Sequence[Direction], names: Iterable[str]) -> tuple[Point, ...]:
    """Return the points of a compass, this board first; none where it has not moved.

    Args:
        directions: This board's point and the directions of faults.
        names: The faults to show, the likeliest first; those without a direction are left out.
    """
    by_name = {item.fault: unit for item in directions if (unit := _unit(item)) is not None}
    board = by_name.get(BOARD)
    if board is None:
        return ()
    bundles: list[tuple[list[str], tuple[float, float]]] = []
    for name in [name for name in names if name in by_name and name != BOARD][:_MOST]:
        x, y = by_name[name]
        near = next((b for b in bundles if x * b[1][0] + y * b[1][1] > _TOGETHER), None)
        if near is None:
            bundles.append(([name], (x, y)))
        else:
            near[0].append(name)
    radius = _BOARD_RADIUS
    points = [Point(letter="o", name=BOARD, x=radius * board[0], y=radius * board[1])]
    for letter, (together, (x, y)) in zip(_LETTERS, bundles, strict=False):
        points.append(Point(letter=letter, name=", ".join(together), x=x, y=y))
    return tuple(points)


def _unit(item: Direction) -> tuple[float, float] | None:
    length = math.hypot(item.dln_high, item.dln_low)
    if not (math.isfinite(length) and length > 0):
        return None
    return item.dln_high / length, item.dln_low / length


def draw_compass(points: Sequence[Point], *, width: int, height: int) -> tuple[str, ...]:
    """Return the compass as rows of plain characters.

    Args:
        points: As ``place_directions`` returns them.
        width: Of the drawing in characters, odd.
        height: Of the drawing in rows, odd.
    """
    middle_x, middle_y = width // 2, height // 2
    cells = [[" "] * width for _ in range(height)]
    cells[middle_y] = ["-"] * width
    for row in cells:
        row[middle_x] = "|"
    cells[middle_y][middle_x] = "+"
    for point in reversed(points):  # this board is drawn last
        cells[middle_y - round(point.y * middle_y)][middle_x + round(point.x * middle_x)] = (
            point.letter
        )
    return tuple("".join(row).rstrip() for row in cells)
