"""How long a recording is to be."""

from __future__ import annotations

from collections.abc import Callable

from benchtool.errors import UsageError
from benchtool.frozen import frozen_record
from benchtool_drivers.streams.window import EdgeWindow

Progress = Callable[[int, int], None]
"""Is told how much is behind, and how much in all."""

_LATE_S = 1.0  # a line that is on its way may still say that the time is over


@frozen_record
class Goal:
    """How long a recording is to be, and who is told how far it has come.

    Attributes:
        until_periods: Complete periods that it is to hold.
        duration_s: Its length in seconds; the first of the two that is reached counts.
        progress: Is told periods, or milliseconds where only a length is given.
        quiet_s: Longest silence in seconds.
    """

    until_periods: int | None = None
    duration_s: float | None = None
    progress: Progress | None = None
    quiet_s: float | None = None

    def __post_init__(self) -> None:
        lengths = [each for each in (self.until_periods, self.duration_s) if each is not None]
        if not lengths or min(lengths) <= 0:
            raise UsageError(
                "a recording needs a length above 0",
                hint="say how many periods or how many seconds it is to hold",
            )

    def reached(self, recorded: EdgeWindow, tick_hz: float) -> int | None:
        """Return the tick at which the recording is long enough, None before; tell the progress."""
        length_s = (recorded.end_tick - recorded.first_tick) / tick_hz
        self._tell(recorded.n_periods, length_s)
        ends = []
        if self.duration_s is not None and length_s >= self.duration_s:
            ends.append(recorded.first_tick + int(self.duration_s * tick_hz))
        if self.until_periods is not None and recorded.n_periods >= self.until_periods:
            ends.append(recorded.tick_of_period(self.until_periods))
        return min(ends, default=None)

    def is_over(self, waited_s: float) -> bool:
        """Return whether the time is over by the clock of this machine."""
        return self.duration_s is not None and waited_s > self.duration_s + _LATE_S

    def _tell(self, n_periods: int, length_s: float) -> None:
        if self.progress is None:
            return
        if self.until_periods is not None:
            self.progress(min(n_periods, self.until_periods), self.until_periods)
        elif self.duration_s is not None:
            total_ms = int(1000 * self.duration_s)
            self.progress(min(int(1000 * length_s), total_ms), total_ms)
