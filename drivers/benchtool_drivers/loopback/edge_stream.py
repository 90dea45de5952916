"""A device that prints edge lines: the other end of a serial stream."""

from __future__ import annotations

import os
import threading
import time
from collections.abc import Iterable
from itertools import islice

from benchtool_drivers.loopback.edge_printer import Printer, print_edges

_HEADER_S = 1.0


class EdgeDevice:
    """A device on a pseudo-terminal that sends lines from a thread of its own.

    Args:
        times_s: Times of the edges.
        printer: What prints them.
        pace: Seconds of signal in a second of time; None to send as fast as the line takes it.
        lines_at_once: Edges that are sent in one piece.
        hold_open: Whether the line stays open, sending heartbeats, after the last edge.
        wait_for_go: Whether to send nothing before ``go`` is called.
    """

    def __init__(
        self,
        times_s: Iterable[float],
        printer: Printer | None = None,
        *,
        pace: float | None = None,
        lines_at_once: int = 1,
        hold_open: bool = True,
        wait_for_go: bool = False,
    ) -> None:
        self._times_s = times_s
        self._printer = printer or Printer()
        self._pace = pace
        self._lines_at_once = lines_at_once
        self._hold_open = hold_open
        self._headed_s = 0.0
        self._stop = threading.Event()
        self._go = threading.Event()
        if not wait_for_go:
            self._go.set()
        self._ours, self._theirs = -1, -1
        self._thread = threading.Thread(target=self._run, name="edge device", daemon=True)

    def start(self) -> str:
        """Begin to send; return the name of the port to open.

        What is sent before somebody opens the port waits for him, as far as the system keeps it.
        """
        import tty

        self._ours, self._theirs = os.openpty()
        tty.setraw(self._theirs)
        os.set_blocking(self._ours, False)
        self._thread.start()
        return os.ttyname(self._theirs)

    def go(self) -> None:
        """Let it begin to send."""
        self._go.set()

    def stop(self) -> None:
        """Hang up."""
        self._stop.set()
        self._go.set()
        self._thread.join(timeout=5)
        self._hang_up()

    def __enter__(self) -> str:
        return self.start()

    def __exit__(self, *_: object) -> None:
        self.stop()

    def _run(self) -> None:
        self._go.wait()
        started = time.monotonic()
        times = iter(self._times_s)
        last_s = 0.0
        while (some := list(islice(times, self._lines_at_once))) and not self._stop.is_set():
            last_s = some[-1]
            self._pass_time(started, some[0])
            self._stop.wait(self._printer.stall_s())
            text = b"".join(print_edges(self._printer, some))
            if not self._send(self._headed(text)) or self._printer.unplugs():
                self._drain()  # the system drops what was not read
                self._hang_up()
                return
        if self._hold_open:
            self._rest(started, last_s)
        else:
            self._drain()
            self._hang_up()

    def _pass_time(self, started: float, time_s: float) -> None:
        """Wait until an edge is due; meanwhile send heartbeats."""
        if self._pace is None:
            return
        beat_s = self._printer.form.heartbeat_ms / 1000
        while (left_s := time_s / self._pace - (time.monotonic() - started)) > 0:
            if self._stop.wait(min(left_s, beat_s)):
                return
            now_s = (time.monotonic() - started) * self._pace
            if left_s > beat_s:
                self._send(self._headed(self._printer.heartbeat(now_s)))

    def _headed(self, text: bytes) -> bytes:
        """Put the header before a text once a second of a paced line: a reader may come late."""
        now_s = time.monotonic()
        if self._pace is None or now_s - self._headed_s < _HEADER_S:
            return text
        self._headed_s = now_s
        return self._printer.header() + text

    def _rest(self, started: float, last_s: float) -> None:
        """Send heartbeats until told to stop."""
        beat_s = self._printer.form.heartbeat_ms / 1000
        ended = time.monotonic()
        while not self._stop.wait(beat_s):
            since_s = time.monotonic() - (ended if self._pace is None else started)
            now_s = last_s + since_s if self._pace is None else since_s * self._pace
            self._send(self._printer.header() + self._printer.heartbeat(max(last_s, now_s)))

    def _send(self, text: bytes) -> bool:
        """Write all of a text, waiting where the line is full."""
        import select

        view = memoryview(text)
        while view and not self._stop.is_set():
            if not select.select([], [self._ours], [], 0.1)[1]:
                continue
            try:
                view = view[os.write(self._ours, view) :]
            except BlockingIOError:
                continue
            except OSError:
                return False
        return not self._stop.is_set()

    def _drain(self) -> None:
        """Wait until the other end has read all, at most two seconds."""
        import fcntl
        import struct
        import termios

        n_empty = 0
        for _ in range(200):
            waiting = fcntl.ioctl(self._theirs, termios.FIONREAD, struct.pack("i", 0))
            n_empty = n_empty + 1 if struct.unpack("i", waiting)[0] == 0 else 0
            if n_empty > 3 or self._stop.wait(0.01):
                return

    def _hang_up(self) -> None:
        for name in ("_theirs", "_ours"):
            number = getattr(self, name)
            if number >= 0:
                setattr(self, name, -1)
                os.close(number)
