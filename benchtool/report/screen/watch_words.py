"""What is said of a reading, on the screen and in one line."""

from __future__ import annotations

import math

from benchtool.model.quantity import Bound, Measured
from benchtool.model.watch import Heading, Mark, Reading
from benchtool.uncertainty import expanded
from benchtool.units import format_measured, format_value

HINTS: dict[Heading, str] = {
    "unmoved": "turn a little: which way it goes is not known until it moved",
    "unclear": "it moved by less than U: turn further, or wait for more readings",
    "towards": "it moved towards the goal: keep turning",
    "past": "it went past the goal: turn back",
    "away": "it moved away from the goal: turn back",
    "there": "at the goal, within U",
}
_SLOW_S = 2.0
_LATE = 1.5
_FAR_U = 9999


def value_text(reading: Reading) -> str:
    """Return the value with its unit and no more digits than its U calls for."""
    value = reading.value
    if isinstance(value, Measured):
        return format_measured(value.value, expanded(value), value.unit).partition(" ±")[0]
    if isinstance(value, Bound):
        if value.at_least is not None:
            return f">{format_value(value.at_least, value.unit, 3)}"
        return f"<{format_value(value.at_most or 0.0, value.unit, 3)}"
    return "---"


def distance_text(reading: Reading) -> str:
    """Return the distance from the goal in percent and in U; nothing without either."""
    value, goal = reading.value, reading.plan.goal
    if not isinstance(value, Measured) or goal is None or reading.distance is None:
        return ""
    share = format_value(reading.distance / goal.value, "1", 3) if goal.value else ""
    words = [f"{'+' if reading.distance > 0 else ''}{share}"]
    U = expanded(value)
    if U > 0:
        times = reading.distance / U
        words.append(f"{times:+.1f} U" if abs(times) < _FAR_U else f"over {_FAR_U} U")
    return "   ".join(words)


def age_text(reading: Reading, now_s: float) -> tuple[str, bool]:
    """Return how old the newest reading is and when the next is due, and whether it is late."""
    came_s, every_s = reading.came_at_s, reading.every_s
    if came_s is None:
        return "waiting for a complete interval", False
    age_s = max(0.0, now_s - came_s)
    words = [f"reading {duration_text(age_s)} old"]
    if every_s is None:
        return words[0], False
    due_s = every_s - age_s
    is_late = age_s > max(_LATE * every_s, 1.0)
    if is_late:
        words.append(f"the next is overdue by {duration_text(-due_s)}")
    elif every_s >= _SLOW_S:
        words.append(f"the next is due in {duration_text(max(0.0, due_s))}")
    return ", ".join(words), is_late


def duration_text(seconds: float) -> str:
    """Return "0.3 s", "12 s", "2 min 05 s" or "1 h 02 min"."""
    if seconds < 9.95:
        return f"{seconds:.1f} s"
    whole = math.floor(seconds + 0.5)
    if whole < 60:
        return f"{whole} s"
    if whole < 3600:
        return f"{whole // 60} min {whole % 60:02} s"
    return f"{whole // 3600} h {whole % 3600 // 60:02} min"


def mark_text(mark: Mark, reading: Reading) -> str:
    """Return a mark, and how far the reading is from it."""
    value = mark.value
    text = f"mark {mark.number}  {format_measured(value.value, expanded(value), value.unit)}"
    if not isinstance(reading.value, Measured) or not value.value:
        return text
    share = reading.value.value / value.value - 1
    return f"{text}   now {'+' if share > 0 else ''}{format_value(share, '1', 3)} from it"


def reading_text(reading: Reading) -> str:
    """Return a reading in one line: figure with U, count, distance from the goal, verdict."""
    value = reading.value
    if isinstance(value, Measured):
        words = [format_measured(value.value, expanded(value), value.unit)]
        words.append(f"n {value.n}")
    else:
        words = [value_text(reading)]
    away = distance_text(reading)
    words += [away] if away else []
    words += [reading.verdict.upper()] if reading.verdict else []
    return "   ".join(words)
