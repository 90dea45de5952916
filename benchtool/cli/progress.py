"""One calm line on stderr while a large file is read: its share, its rate, the time left."""

from __future__ import annotations

import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from typing import TextIO

LEAST_S = 1.0
"""A walk that takes no longer than that gets no line."""

NO_BYTES = ("recording", "counting")
"""Walks that are told in something else than bytes, such as periods or readings."""

_EVERY_S = 0.2
_BAR = 20
_SHOWN: list[Progress] = []


class Progress:
    """Draws the line, and takes it away again.

    Args:
        stream: A terminal.
    """

    def __init__(self, stream: TextIO) -> None:
        self._stream = stream
        self._doing = ""
        self._start_s = self._last_s = 0.0
        self._first = self._done = 0
        self._width = 0

    def __call__(self, doing: str, done: int, total: int) -> None:
        """Take what a walk tells, and draw it at most five times a second."""
        now_s = time.monotonic()
        if doing != self._doing or done < self._done:
            self.clear()
            self._doing, self._start_s, self._first = doing, now_s, done
        self._done = done
        if done >= total:
            self.clear()
        elif now_s - self._start_s >= LEAST_S and now_s - self._last_s >= _EVERY_S:
            self._last_s = now_s
            self._draw(progress_line(doing, done, total, self._rate(now_s)))

    def _rate(self, now_s: float) -> float:
        return (self._done - self._first) / max(now_s - self._start_s, 1e-3)

    def _draw(self, line: str) -> None:
        self._stream.write("\r" + line.ljust(self._width))
        self._stream.flush()
        self._width = len(line)

    def clear(self) -> None:
        """Take the line away."""
        if self._width:
            self._stream.write("\r" + " " * self._width + "\r")
            self._stream.flush()
            self._width = 0


def progress_line(doing: str, done: int, total: int, rate: float) -> str:
    """Return the line, under 80 columns.

    Args:
        doing: What goes on.
        done: Bytes behind.
        total: Bytes in all.
        rate: Bytes a second.
    """
    share = done / total
    filled = int(share * _BAR)
    bar = "#" * filled + "." * (_BAR - filled)
    left = _told((total - done) / rate) if rate > 0 else "?"
    if doing in NO_BYTES:
        return f"{doing:<9} [{bar}] {share:4.0%}, {left} left"
    size = f"{total / 1e6:.0f} MB" if total < 1e10 else f"{total / 1e9:.0f} GB"
    return f"{doing:<9} [{bar}] {share:4.0%} of {size}, {rate / 1e6:.0f} MB/s, {left} left"


def _told(seconds: float) -> str:
    whole = round(seconds)
    if whole < 60:
        return f"{whole} s"
    if whole < 3600:
        return f"{whole // 60} min {whole % 60:02} s"
    return f"{whole // 3600} h {whole % 3600 // 60:02} min"


@contextmanager
def progress_shown() -> Iterator[None]:
    """Show how far long walks have come, inside a ``with`` block, and leave no trace of it."""
    from benchtool.model.watching import watched

    progress = Progress(sys.stderr)
    _SHOWN.append(progress)
    try:
        with watched(progress):
            yield
    finally:
        _SHOWN.remove(progress)
        progress.clear()


def make_room() -> None:
    """Take the line away before something else is written to the terminal."""
    for progress in _SHOWN:
        progress.clear()
