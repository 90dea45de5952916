"""Who is shown a watch: a terminal, a pipe, or a terminal that can only print lines."""

from __future__ import annotations

import json
import math
import os
import sys

from benchtool import __version__
from benchtool.cli.output import made_at
from benchtool.cli.watch_terminal import Canvas, Keyboard
from benchtool.model.quantity import Measured
from benchtool.model.watch import Reading
from benchtool.uncertainty import expanded

KEYS = "m mark   u undo mark   a accept   q quit"
NO_KEYS = "no keys on this terminal: Ctrl-C ends"
_DRAW_S = 0.1
_RING_S = (0.2, 2.0)
_FAR_REL = 0.2  # distance from the goal at which the tone is slowest


class Silent:
    """Shown nothing; keeps the last reading."""

    def __init__(self) -> None:
        self.last: Reading | None = None
        self.now_s = 0.0

    def update(self, reading: Reading, now_s: float) -> None:
        """Keep the reading."""
        self.last, self.now_s = reading, now_s

    def tick(self, reading: Reading, now_s: float) -> None:
        """Keep the reading."""
        self.last, self.now_s = reading, now_s

    def pressed(self) -> str:
        """Return no keys."""
        return ""


class Documents(Silent):
    """Prints one JSON document a line for each capture."""

    def update(self, reading: Reading, now_s: float) -> None:
        """Print the document."""
        from benchtool.report.watching import watch_document

        super().update(reading, now_s)
        document = watch_document(reading, now_s, version=__version__, made_at=made_at())
        sys.stdout.write(json.dumps(document, allow_nan=False) + "\n")
        sys.stdout.flush()


class Lines(Silent):
    """Prints one plain line for each capture, on a terminal that cannot be drawn on."""

    def update(self, reading: Reading, now_s: float) -> None:
        """Print the line."""
        from benchtool.report.screen.watch_words import reading_text
        from benchtool.report.text import spelled

        super().update(reading, now_s)
        text = ("moved  " if reading.moved else "       ") + reading_text(reading)
        sys.stdout.write(spelled(text, sys.stdout.encoding or "ascii") + "\n")
        sys.stdout.flush()


class Screen(Silent):
    """Draws on a terminal, at most ten times a second, and listens to its keys.

    Args:
        canvas: What is drawn on.
        keyboard: Whose keys are read.
        tone: Whether to ring the bell, the quicker the nearer the goal.
    """

    def __init__(self, canvas: Canvas, keyboard: Keyboard, *, tone: bool) -> None:
        super().__init__()
        self._canvas = canvas
        self._keyboard = keyboard
        self._tone = tone
        self._drawn_s = self._rung_s = -math.inf

    def tick(self, reading: Reading, now_s: float) -> None:
        """Draw what is known, and ring where it is time to."""
        from benchtool.report.screen.watch import Frame, watch_rows

        super().tick(reading, now_s)
        if now_s - self._drawn_s >= _DRAW_S:
            self._drawn_s = now_s
            width, height = self._canvas.size()
            ink = "█" if self._canvas.encoding.lower().startswith("utf") else "#"
            keys = KEYS if self._keyboard.works else NO_KEYS
            frame = Frame(width=width, height=height, ink=ink, keys=keys)
            self._canvas.draw(watch_rows(reading, now_s, frame))
        every_s = ring_interval(reading) if self._tone else None
        if every_s is not None and now_s - self._rung_s >= every_s:
            self._rung_s = now_s
            self._canvas.ring()

    def pressed(self) -> str:
        """Return the keys pressed.

        Raises:
            KeyboardInterrupt: If a signal has ended the watch.
        """
        self._canvas.heed()
        return self._keyboard.pressed()


def ring_interval(reading: Reading) -> float | None:
    """Return the seconds between two bells: nearer is quicker; None without a goal or a value.

    From 0.2 s within U of the goal to 2 s a fifth away from it, by the logarithm of the distance.
    """
    value, goal = reading.value, reading.plan.goal
    if goal is None or not isinstance(value, Measured) or reading.distance is None:
        return None
    quick_s, slow_s = _RING_S
    near, away = expanded(value), abs(reading.distance)
    far = max(_FAR_REL * abs(goal.value), 2 * near)
    if away <= near or near == 0:
        return quick_s if away <= near else slow_s
    share = min(1.0, math.log(away / near) / math.log(far / near))
    return quick_s + (slow_s - quick_s) * share


def can_draw() -> bool:
    """Tell whether stdout is a terminal that can be drawn on."""
    return sys.stdout.isatty() and os.environ.get("TERM", "") not in ("", "dumb")
