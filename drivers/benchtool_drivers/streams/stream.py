"""A stream of edges: its newest stretch, or a whole one of a given length."""

from __future__ import annotations

import time

from benchtool.errors import InstrumentTimeoutError, Step
from benchtool.model.capture import Capture
from benchtool.model.quantity import Notice
from benchtool_drivers.streams.capturing import capture_stretch
from benchtool_drivers.streams.feed import Feed
from benchtool_drivers.streams.goal import Goal, Progress
from benchtool_drivers.streams.intake import Intake
from benchtool_drivers.streams.layout import Layout
from benchtool_drivers.streams.sequence import Sink
from benchtool_drivers.streams.window import EdgeWindow

WINDOW_PERIODS = 100
MOST_PERIODS = 1 << 20
RECORD_EDGES = 1 << 26
"""Edges that a recording holds at most; 600 MB."""

_DEAD_HEARTBEATS = 4
_DEAD_MARGIN_S = 1.0
_LOOK_S = 0.2


class EdgeStream:
    """Edges from a feed; a ``Stream`` as ``benchtool.instruments`` has it.

    Args:
        feed: Where bytes come from.
        source: The connection, as the user named it.
        layout: What lines look like; None where a header line will say.
        window_periods: Periods that ``newest`` gives at most.
        window_s: Seconds that it gives at most, though never less than two periods.
        joined: Whether the stream had begun before.
    """

    def __init__(
        self,
        feed: Feed,
        source: str,
        layout: Layout | None,
        *,
        window_periods: int = WINDOW_PERIODS,
        window_s: float | None = None,
        joined: bool = True,
    ) -> None:
        self._feed = feed
        self._source = source
        self._window_edges = 2 * window_periods + 1
        self._window_s = window_s
        self._sinks: list[Sink] = []
        self._intake = Intake(source, layout, self._sinks, joined=joined)
        self._window: EdgeWindow | None = None
        self._opened = time.monotonic()

    @property
    def source(self) -> str:
        """The connection, as the user named it."""
        return self._source

    @property
    def intake(self) -> Intake:
        """What was counted since the stream was opened."""
        return self._intake

    def newest(self, timeout_s: float) -> Capture | None:
        """Return the newest stretch, None where no edge and no heartbeat came within the time.

        Its times are seconds after the first line that was read; its ``window`` says where in
        them it lies, so that two of them can be told apart. What was lost in it is a gap between
        its spans and counted in its warnings.

        Raises:
            NotConnectedError: If the connection has gone, once all that came was given.
            InstrumentTimeoutError: ``no-heartbeat``: if a device that promised one is dead.
            ReplyError: If what comes cannot be read.
        """
        until = time.monotonic() + timeout_s
        n_before = self._intake.n_rows
        while self._intake.n_rows == n_before:
            left = until - time.monotonic()
            if not self._take(max(0.0, left)) and left <= 0:
                self._check_alive()
                return None
        while self._feed.waiting and time.monotonic() < until:
            self._take(0.0)
        return self._captured()

    def record(
        self,
        *,
        until_periods: int | None = None,
        duration_s: float | None = None,
        progress: Progress | None = None,
        quiet_s: float | None = None,
    ) -> Capture:
        """Return the whole stretch from now on, until it is long enough.

        Args:
            until_periods: Complete periods that it is to hold.
            duration_s: Its length in seconds; whichever of the two is reached first ends it.
            progress: Is told periods behind and in all, or milliseconds where only a length was
                given.
            quiet_s: Longest silence in seconds; None to wait for ever where no heartbeat is
                promised.

        Returns:
            A capture whose times begin with its first line.

        Raises:
            UsageError: If no length above 0 was given.
            NotConnectedError: If the connection goes meanwhile; nothing is returned then.
            InstrumentTimeoutError: If it is silent too long.
        """
        goal = Goal(
            until_periods=until_periods, duration_s=duration_s, progress=progress, quiet_s=quiet_s
        )
        recorded = EdgeWindow()
        self._sinks.append(recorded)
        try:
            extra = self._fill(recorded, goal)
        finally:
            self._sinks.remove(recorded)
        return capture_stretch(
            recorded,
            self._known_layout(),
            self._source,
            decimals=self._intake.decimals,
            whole=True,
            extra=extra,
        )

    def close(self) -> None:
        """End the connection."""
        self._feed.close()

    def _take(self, timeout_s: float) -> bool:
        """Take what the feed has; return whether it had anything."""
        delivery = self._feed.take(timeout_s)
        self._make_window()
        if delivery.data:
            self._intake.feed(delivery.data, delivery.silent_s, overrun=delivery.overrun)
        if self._intake.layout is None:
            self._intake.check_header(time.monotonic() - self._opened)
        return bool(delivery.data)

    def _make_window(self) -> None:
        """Make the window of the newest edges; how long it may be needs the tick rate."""
        if self._window is None:
            self._window = EdgeWindow(most_edges=self._window_edges)
            self._sinks.append(self._window)
        layout = self._intake.layout
        if self._window_s is not None and layout is not None:
            self._window.most_ticks = int(self._window_s * layout.tick_hz)

    def _captured(self) -> Capture:
        self._make_window()
        window = self._window or EdgeWindow()
        window.trim()
        return capture_stretch(
            window, self._known_layout(), self._source, decimals=self._intake.decimals
        )

    def _known_layout(self) -> Layout:
        layout = self._intake.layout
        if layout is None:
            raise RuntimeError("rows came before their layout was known")
        return layout

    def _fill(self, recorded: EdgeWindow, goal: Goal) -> tuple[Notice, ...]:
        """Read until the recording is long enough; return what has to be said of it."""
        started = time.monotonic()
        while True:
            layout = self._intake.layout
            if layout is not None and recorded.begun:
                end_tick = goal.reached(recorded, layout.tick_hz)
                if end_tick is not None:
                    recorded.cut(end_tick)
                    return ()
            if recorded.n_held >= RECORD_EDGES:
                text = f"the recording was ended at {recorded.n_held} edges, as many as it holds"
                return (Notice(code="stream-record-full", text=text),)
            if self._take(_LOOK_S):
                continue
            self._check_alive(goal.quiet_s)
            if goal.is_over(time.monotonic() - started):
                return self._ended(recorded, goal)

    def _ended(self, recorded: EdgeWindow, goal: Goal) -> tuple[Notice, ...]:
        """End a recording by the clock of this machine, as no line says that its time is over."""
        if recorded.begun:
            return ()
        raise InstrumentTimeoutError(
            f"nothing came from {self._source} in {goal.duration_s:g} s",
            hint="see that the device runs, and is connected to this port",
            step=Step(resource=self._source, expected="a line"),
        )

    def _check_alive(self, quiet_s: float | None = None) -> None:
        """See that the stream is not silent for too long."""
        heartbeat_s = self._intake.layout.heartbeat_s if self._intake.layout else None
        limit_s = quiet_s
        if heartbeat_s is not None:
            limit_s = max(_DEAD_HEARTBEATS * heartbeat_s, heartbeat_s + _DEAD_MARGIN_S)
        silent_s = self._feed.quiet_s()
        if limit_s is None or silent_s <= limit_s:
            return
        promised = f" (it promised a heartbeat every {heartbeat_s:g} s)" if heartbeat_s else ""
        raise InstrumentTimeoutError(
            f"nothing has come from {self._source} for {silent_s:.1f} s{promised}",
            hint="see that the device runs and is connected; a signal at rest would still give "
            "heartbeats where the device sends them",
            step=Step(
                resource=self._source,
                expected="a line",
                last_good=f"{self._intake.n_rows} lines taken",
            ),
            code="no-heartbeat",
        )
