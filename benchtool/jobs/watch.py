"""The watch: capture after capture, a reading each, until the user or the source ends it."""

from __future__ import annotations

import time
from collections.abc import Callable
from typing import Literal, Protocol

from benchtool.errors import NoTriggerError
from benchtool.instruments import Stream
from benchtool.jobs.counting import called
from benchtool.jobs.watch_feed import Feed
from benchtool.jobs.watch_plan import plan_watch
from benchtool.jobs.watch_sight import View, look_at
from benchtool.jobs.watch_state import WatchState, advance, begin, hinder, mark, unmark
from benchtool.model.quantity import Measured, Notice
from benchtool.model.watch import Reading, WatchPlan

__all__ = ["Audience", "Ending", "View", "plan_watch", "press", "watch"]

TICK_S = 0.1
"""Between two looks at keys and clock, and so the most that the age shown is behind."""

Ending = Literal["left", "accepted", "enough"]


class Audience(Protocol):
    """Who is shown the readings, and presses keys."""

    def update(self, reading: Reading, now_s: float) -> None:
        """Take the reading after a further capture."""
        ...

    def tick(self, reading: Reading, now_s: float) -> None:
        """Take what is known, a moment later; called at least every ``TICK_S``."""
        ...

    def pressed(self) -> str:
        """Return the keys pressed since the last call."""
        ...


def watch(
    stream: Stream,
    plan: WatchPlan,
    view: View,
    audience: Audience,
    *,
    most_updates: int | None = None,
    clock: Callable[[], float] = time.monotonic,
) -> tuple[Reading, Ending]:
    """Follow a source until the user leaves; the stream is closed in any case.

    Keys: m marks the reading, u takes the last mark back, a accepts it, q leaves.

    Args:
        stream: The source.
        plan: What is watched.
        view: How its captures are looked at.
        audience: Who is shown it.
        most_updates: Captures after which to leave.
        clock: Seconds, always forward.

    Returns:
        The last reading, and what ended the watch.

    Raises:
        InstrumentError: If the source has gone; the audience has seen the last reading.
        UsageError: If several traces could be meant.
    """
    state = begin(plan)
    with Feed(stream, pace_s=0.0 if view.own_axis else TICK_S) as feed:
        while True:
            try:
                capture = feed.take(TICK_S)
            except NoTriggerError as error:
                capture, state = None, hinder(state, Notice(code=error.code, text=error.message))
            if capture is not None:
                now_s = clock()
                sight, view = look_at(called(capture, plan.instrument), view, now_s)
                state = advance(state, sight)
                audience.update(state.reading, now_s)
            for key in audience.pressed():
                state, ending = press(state, key)
                if ending is not None:
                    return state.reading, ending
            audience.tick(state.reading, clock())
            if most_updates is not None and state.reading.n_updates >= most_updates:
                return state.reading, "enough"


def press(state: WatchState, key: str) -> tuple[WatchState, Ending | None]:
    """Return the state after a key, and what it ends; a reading without a value is not accepted."""
    match key.lower():
        case "m":
            return mark(state), None
        case "u":
            return unmark(state), None
        case "a" if isinstance(state.reading.value, Measured):
            return state, "accepted"
        case "q":
            return state, "left"
    return state, None
