"""The screen of a watch: plain rows, cheap to draw ten times a second."""

from __future__ import annotations

from textwrap import wrap
from typing import Literal

from benchtool.frozen import frozen_record
from benchtool.model.quantity import Measured
from benchtool.model.watch import WATCHED_UNITS, Reading
from benchtool.report.numberline import NumberLine, draw_line
from benchtool.report.phrases import LABELS, check_line, limits_text, verdict_sentence
from benchtool.report.screen.watch_digits import ROWS, enlarge
from benchtool.report.screen.watch_strip import draw_goal, draw_strip
from benchtool.report.screen.watch_words import (
    HINTS,
    age_text,
    distance_text,
    mark_text,
    value_text,
)
from benchtool.report.text import printable
from benchtool.uncertainty import expanded
from benchtool.units import format_value

Tone = Literal["", "strong", "faint", "good", "doubt", "bad"]
Row = tuple[tuple[str, Tone], ...]

_TONES: dict[str | None, Tone] = {
    "pass": "good",
    "fail": "bad",
    None: "strong",
}
_LEGEND = "| limit   [ ] accepted   o value   ( ) its U   ^ goal   < > off the line"
_LEGEND_OF_GOAL = "| goal   o value   ( ) its U   < > off the line"
_MARGIN = 2
_LEAST_ROOM = 20
_LEAST_BELOW = 3


@frozen_record
class Frame:
    """What there is to draw on.

    Attributes:
        width, height: Columns and rows.
        ink: What large figures are made of.
        keys: What is said of the keys.
        lost: Why the source has gone, where it has.
    """

    width: int
    height: int
    ink: str = "#"
    keys: str = ""
    lost: str = ""


@frozen_record
class _Block:
    """Rows that are drawn together or not at all; those of least weight go first."""

    rows: tuple[Row, ...]
    weight: int


def watch_rows(reading: Reading, now_s: float, frame: Frame) -> list[Row]:
    """Return the rows of the screen, no more than there are and none wider.

    Args:
        reading: What is known.
        now_s: Now, on the clock of the watcher.
        frame: What there is to draw on.
    """
    blocks = _blocks(reading, now_s, frame)
    while sum(len(block.rows) for block in blocks) > frame.height and len(blocks) > 1:
        blocks.remove(min(blocks, key=lambda block: block.weight))
    rows = [row for block in blocks for row in block.rows][: frame.height]
    return [_fitted(row, frame.width) for row in rows]


def _blocks(reading: Reading, now_s: float, frame: Frame) -> list[_Block]:
    """Return the blocks from top to bottom; the strip takes the rows that are left."""
    blank: tuple[tuple[Row, ...], int] = (((("", ""),),), 1)
    above = [
        (_heading_rows(reading, frame), 60),
        blank,
        (_value_rows(reading, frame), 100),
        (_detail_rows(reading), 90),
        (_goal_rows(reading), 85),
        (_line_rows(reading, frame), 50),
        (_verdict_rows(reading, frame), 70),
        (_legend_rows(reading), 0),
    ]
    below = [
        (_hint_rows(reading), 80),
        (_age_rows(reading, now_s, frame), 75),
        (_mark_rows(reading), 40),
        (_trouble_rows(reading), 45),
        (_key_rows(frame), 78),
    ]
    made = [[_Block(rows=rows, weight=weight) for rows, weight in part] for part in (above, below)]
    left = frame.height - sum(len(block.rows) for part in made for block in part)
    strip = _Block(rows=_strip_rows(reading, frame, min(max(left - 1, 3), 10)), weight=20)
    return [*made[0], strip, *made[1]]


def _said(text: str, tone: Tone = "") -> Row:
    return ((" " * _MARGIN, ""), (printable(text), tone))


def _heading_rows(reading: Reading, frame: Frame) -> tuple[Row, ...]:
    design, stage = reading.plan.design, reading.plan.stage
    about = LABELS.get(reading.plan.quantity, reading.plan.quantity)
    if design is not None and stage is not None:
        several = f", stage {stage.name}" if len(design.stages) > 1 else ""
        about = f"{about}   {design.name}{several}"
    name = printable(reading.source.name) if reading.source else "waiting for the first capture"
    room = frame.width - 2 * _MARGIN - len(about) - len(name)
    if room < 2:
        return (_said(about, "strong"),)
    return (((" " * _MARGIN, ""), (printable(about), "strong"), (" " * room, ""), (name, "faint")),)


def _value_rows(reading: Reading, frame: Frame) -> tuple[Row, ...]:
    text = value_text(reading)
    tone = _TONES.get(reading.verdict, "doubt")
    room = frame.width - 2 * _MARGIN
    if frame.height < ROWS + _LEAST_BELOW or text == "---":
        return (_said(text, tone),)
    scale = 2 if frame.height >= 2 * ROWS + 18 else 1
    return tuple(
        ((" " * _MARGIN, ""), (row, tone))
        for row in enlarge(text, room, ink=frame.ink, scale=scale)
    )


def _detail_rows(reading: Reading) -> tuple[Row, ...]:
    value = reading.value
    if not isinstance(value, Measured):
        what = "nothing measured yet" if value is None else "no complete interval since it moved"
        return (_said(what),)
    U = expanded(value)
    n = reading.n_averaged
    average = f"average of {n} intervals" if n > 1 else "one interval"
    since = " since it moved" if reading.change is not None else ""
    return (_said(f"± {format_value(U, value.unit, 2)}   {average}{since}"),)


def _goal_rows(reading: Reading) -> tuple[Row, ...]:
    goal = reading.plan.goal
    if goal is None:
        return ()
    unit = WATCHED_UNITS[reading.plan.quantity]
    said = f"goal {format_value(goal.value, unit, 6)} ({goal.source})"
    away = distance_text(reading)
    if not away:
        return (_said(said),)
    return (((" " * _MARGIN, ""), (f"{away:<24}", "strong"), (f"from the {said}", "")),)


def _number_line(reading: Reading) -> NumberLine | None:
    if reading.check is not None and (
        reading.check.lower is not None or reading.check.upper is not None
    ):
        return check_line(reading.check)
    goal, value = reading.plan.goal, reading.value
    if goal is None:
        return None
    measured = value if isinstance(value, Measured) else None
    return NumberLine(
        value=measured.value if measured else None,
        U=expanded(measured) if measured else 0.0,
        lower=goal.value,
        upper=goal.value,
    )


def _line_rows(reading: Reading, frame: Frame) -> tuple[Row, ...]:
    line, goal, check = _number_line(reading), reading.plan.goal, reading.check
    if line is None:
        return ()
    width = frame.width - 2 * _MARGIN
    drawn = _said(draw_line(line, width))
    if check is None:
        return (drawn,)
    limits = f"limits {limits_text(check.lower, check.upper, check.unit)}"
    if goal is None:
        return (drawn, _said(limits, "faint"))
    return (drawn, _said(draw_goal(line, goal.value, f"goal, {limits}", width), "faint"))


def _verdict_rows(reading: Reading, frame: Frame) -> tuple[Row, ...]:
    if reading.verdict is None or reading.result is None:
        return ()
    tone = _TONES.get(reading.verdict, "doubt")
    word = f"{reading.verdict.upper()}  "
    room = max(frame.width - 2 * _MARGIN - len(word), _LEAST_ROOM)
    why = wrap(printable(verdict_sentence(reading.result)), room, max_lines=2, placeholder=" …")
    first: Row = ((" " * _MARGIN, ""), (word, tone), (why[0] if why else "", ""))
    return (first, *(_said(" " * len(word) + line) for line in why[1:]))


def _legend_rows(reading: Reading) -> tuple[Row, ...]:
    if _number_line(reading) is None:
        return ()
    return (_said(_LEGEND if reading.check else _LEGEND_OF_GOAL, "faint"),)


def _strip_rows(reading: Reading, frame: Frame, height: int) -> tuple[Row, ...]:
    goal = reading.plan.goal
    strip = draw_strip(
        reading.points,
        goal.value if goal else None,
        WATCHED_UNITS[reading.plan.quantity],
        least_span=4 * expanded(reading.value) if isinstance(reading.value, Measured) else 0.0,
        width=frame.width - 2 * _MARGIN,
        height=height,
    )
    return tuple(
        ((" " * _MARGIN, ""), (row[: strip.since], "faint"), (row[strip.since :], ""))
        for row in strip.rows
    )


def _hint_rows(reading: Reading) -> tuple[Row, ...]:
    value, change = reading.value, reading.change
    if not isinstance(value, Measured):
        return ()
    words = []
    if change is not None:
        sign = "+" if change.value > 0 else ""
        words.append(f"last move {sign}{format_value(change.value, change.unit, 3)}")
    if reading.plan.goal is not None:
        words.append(HINTS[reading.heading])
    return (_said("   ".join(words), "strong"),) if words else ()


def _age_rows(reading: Reading, now_s: float, frame: Frame) -> tuple[Row, ...]:
    if frame.lost:
        return (_said(frame.lost, "bad"),)
    text, is_late = age_text(reading, now_s)
    return (_said(text, "doubt" if is_late else ""),)


def _mark_rows(reading: Reading) -> tuple[Row, ...]:
    if not reading.marks:
        return ()
    return (_said(mark_text(reading.marks[-1], reading)),)


def _trouble_rows(reading: Reading) -> tuple[Row, ...]:
    if reading.trouble is None:
        return ()
    return (_said(f"{reading.trouble.text}  [{reading.trouble.code}]", "doubt"),)


def _key_rows(frame: Frame) -> tuple[Row, ...]:
    return (_said(frame.keys, "faint"),) if frame.keys else ()


def _fitted(row: Row, width: int) -> Row:
    """Return a row cut to the width."""
    kept: list[tuple[str, Tone]] = []
    for text, tone in row:
        room = width - sum(len(part) for part, _ in kept)
        kept.append((text[:room], tone))
    return tuple((text, tone) for text, tone in kept if text)
