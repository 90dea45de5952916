"""Where the marks of a number line lie, in percent of its width."""

from __future__ import annotations

import math
from typing import Literal

from benchtool.frozen import frozen_record
from benchtool.report.numberline import NumberLine
from benchtool.report.page.views import Line

_EDGE = 1.5  # percent kept free at each end
_NEAR_END = 14.0  # a label nearer to an end than this would reach beyond it

Anchor = Literal["start", "middle", "end"]


@frozen_record
class Tick:
    """A limit: where it is, its figure, and how the figure is set under it."""

    x: float
    text: str
    anchor: Anchor


@frozen_record
class Piece:
    """A piece of the line."""

    x: float
    width: float


@frozen_record
class Drawing:
    """All marks of a number line; what is not there is None or empty."""

    ticks: tuple[Tick, ...]
    guards: tuple[Piece, ...]
    accepted: Piece | None
    value: float | None
    spread: Piece | None
    off: Literal["left", "right"] | None
    bound: Piece | None


def place_marks(line: Line) -> Drawing:
    """Return where everything on a number line lies.

    Args:
        line: A line with at least one limit.
    """
    scale = line.scale
    inside = _piece(scale, scale.lower, scale.upper)
    accepted = _accepted(scale)
    off = off_line(line)
    known = scale.value if scale.value is not None or off is None else _nearest(line)
    return Drawing(
        ticks=_ticks(line),
        guards=_guards(inside, accepted),
        accepted=accepted,
        value=None if known is None else _percent(scale, known),
        spread=None if off else _spread(scale),
        off=off,
        bound=None if off else _bound(line),
    )


def off_line(line: Line) -> Literal["left", "right"] | None:
    """Return the end beyond which the value, or all that a bound allows, lies; None if on it.

    Args:
        line: A line with at least one limit.
    """
    known = _nearest(line)
    if known is None:
        return None
    place = line.scale.place(known)
    if place < 0 and line.at_least is None:
        return "left"
    return "right" if place > 1 and line.at_most is None else None


def _nearest(line: Line) -> float | None:
    """Return the value, or the end of a bound."""
    if line.scale.value is not None:
        return line.scale.value
    return line.at_most if line.at_least is None else line.at_least


def _percent(scale: NumberLine, x: float) -> float:
    return round(_EDGE + (100 - 2 * _EDGE) * min(max(scale.place(x), 0.0), 1.0), 2)


def _piece(scale: NumberLine, low: float | None, high: float | None) -> Piece:
    start = 0.0 if low is None else _percent(scale, low)
    stop = 100.0 if high is None else _percent(scale, high)
    return Piece(x=start, width=round(max(0.0, stop - start), 2))


def _ticks(line: Line) -> tuple[Tick, ...]:
    scale = line.scale
    limits = [(scale.lower, line.lower), (scale.upper, line.upper)]
    if scale.lower == scale.upper:
        limits = limits[:1]
    return tuple(
        Tick(x=_percent(scale, limit), text=text, anchor=_anchor(_percent(scale, limit)))
        for limit, text in limits
        if limit is not None
    )


def _anchor(x: float) -> Anchor:
    if x < _NEAR_END:
        return "start"
    return "end" if x > 100 - _NEAR_END else "middle"


def _accepted(scale: NumberLine) -> Piece | None:
    if scale.accept_lower is None and scale.accept_upper is None:
        return None
    return _piece(scale, scale.accept_lower, scale.accept_upper)


def _guards(inside: Piece, accepted: Piece | None) -> tuple[Piece, ...]:
    """Return what the guard band takes from the limits, all of it where nothing is left."""
    if accepted is None:
        return (inside,)
    left = Piece(x=inside.x, width=round(accepted.x - inside.x, 2))
    end = accepted.x + accepted.width
    right = Piece(x=end, width=round(inside.x + inside.width - end, 2))
    return tuple(piece for piece in (left, right) if piece.width > 0)


def _spread(scale: NumberLine) -> Piece | None:
    if scale.value is None or not math.isfinite(scale.U) or scale.U == 0:
        return None
    return _piece(scale, scale.value - scale.U, scale.value + scale.U)


def _bound(line: Line) -> Piece | None:
    if line.at_least is None and line.at_most is None:
        return None
    return _piece(line.scale, line.at_least, line.at_most)
