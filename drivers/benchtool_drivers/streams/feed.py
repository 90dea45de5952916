"""Bytes from a port or a pipe, read beside the program so that none waits for it."""

from __future__ import annotations

import threading
import time
from collections import deque
from collections.abc import Callable
from dataclasses import dataclass
from typing import Protocol

from benchtool.frozen import frozen_record

POLL_S = 0.05
"""How long a read waits, so that an end is noticed."""

MOST_PENDING = 64 << 20
"""Bytes that may wait; at a million lines a second some four seconds."""


class Tap(Protocol):
    """Where bytes come from."""

    def read(self, timeout_s: float) -> bytes:
        """Return what is there, or comes within the time; nothing where nothing came.

        Raises:
            InstrumentError: If nothing will come any more.
        """
        ...

    def close(self) -> None:
        """Let go of it."""
        ...


@frozen_record
class Delivery:
    """What came.

    Attributes:
        data: Bytes in order.
        silent_s: Seconds for which nothing had come right before them.
        overrun: Whether reading had to wait because too much lay here.
    """

    data: bytes = b""
    silent_s: float = 0.0
    overrun: bool = False


@dataclass(slots=True)
class _Spell:
    """What came without a pause, and the silence before it."""

    silent_s: float
    overrun: bool
    chunks: list[bytes]


class Feed:
    """Reads a tap in a thread of its own.

    Args:
        tap: Where bytes come from.
        name: Name for the thread.
        most_pending: Bytes that may wait here.
        clock: Seconds, for tests.
    """

    def __init__(
        self,
        tap: Tap,
        name: str,
        *,
        most_pending: int = MOST_PENDING,
        clock: Callable[[], float] = time.monotonic,
    ) -> None:
        self._tap = tap
        self._most_pending = most_pending
        self._clock = clock
        self._changed = threading.Condition()
        self._spells: deque[_Spell] = deque()
        self._n_pending = 0
        self._end: Exception | None = None
        self._closing = False
        self._last_arrival = clock()
        self._thread = threading.Thread(target=self._run, name=f"feed of {name}", daemon=True)
        self._thread.start()

    def take(self, timeout_s: float) -> Delivery:
        """Return what has come up to the next silence; wait for it where nothing has.

        Raises:
            InstrumentError: If nothing will come any more, once all that came was taken.
        """
        with self._changed:
            self._changed.wait_for(lambda: bool(self._spells) or self._end, timeout_s)
            if not self._spells:
                if self._end is not None:
                    raise self._end
                return Delivery()
            spell = self._spells.popleft()
            data = b"".join(spell.chunks)
            self._n_pending -= len(data)
            self._changed.notify_all()
        return Delivery(data=data, silent_s=spell.silent_s, overrun=spell.overrun)

    @property
    def waiting(self) -> bool:
        """Whether anything lies here."""
        return bool(self._spells)

    def quiet_s(self) -> float:
        """Return the seconds since anything came."""
        with self._changed:
            return 0.0 if self._spells else self._clock() - self._last_arrival

    def close(self) -> None:
        """Stop reading and let go of the tap."""
        with self._changed:
            self._closing = True
            self._changed.notify_all()
        self._thread.join(timeout=2.0)
        self._tap.close()

    def _run(self) -> None:
        last_empty: float | None = None
        while not self._closing:
            try:
                data = self._tap.read(POLL_S)
            except Exception as error:  # a thread cannot raise: whoever takes gets it
                self._finish(error)
                return
            now = self._clock()
            if not data:
                last_empty = now
                continue
            silent_s = 0.0 if last_empty is None else last_empty - self._last_arrival
            last_empty = None
            self._put(data, silent_s, now)

    def _put(self, data: bytes, silent_s: float, now: float) -> None:
        with self._changed:
            overrun = self._n_pending > self._most_pending
            if overrun:
                self._changed.wait_for(lambda: not self._spells or self._closing)
            if silent_s > 0 or overrun or not self._spells:
                self._spells.append(_Spell(silent_s=silent_s, overrun=overrun, chunks=[]))
            self._spells[-1].chunks.append(data)
            self._n_pending += len(data)
            self._last_arrival = now
            self._changed.notify_all()

    def _finish(self, error: Exception) -> None:
        with self._changed:
            self._end = error
            self._changed.notify_all()
