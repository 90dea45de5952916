"""Answers that wait inside an instrument until they are fetched, piece by piece."""

from __future__ import annotations

import threading
import time
from collections import deque

from benchtool_drivers.loopback.faults import Plan
from benchtool_drivers.loopback.responder import Responder
from benchtool_drivers.loopback.transports.streams import POLL_S


class Piece:
    """Part of an answer.

    Args:
        due_s: When it is there, on the clock of ``time.monotonic``.
        data: Its bytes.
        last: Whether the answer ends with it.
        ending: How the connection ends here.
        n_announced: How long the answer is said to be, where only a part of it is given.
    """

    def __init__(
        self, due_s: float, data: bytes, *, last: bool, ending: str = "", n_announced: int = 0
    ) -> None:
        self.due_s = due_s
        self.data = memoryview(data)
        self.last = last
        self.ending = ending
        self.n_announced = n_announced

    def cut(self, n_bytes: int) -> memoryview:
        """Take so many bytes off its front."""
        taken, self.data = self.data[:n_bytes], self.data[n_bytes:]
        return taken


class Outbox:
    """The pieces of all answers that have not been fetched.

    Args:
        responder: Where answers come from that are due later.
        stopping: Is set when nobody needs to wait any more.
    """

    def __init__(self, responder: Responder, stopping: threading.Event) -> None:
        self._responder = responder
        self._stopping = stopping
        self._pieces: deque[Piece] = deque()

    def put(self, plans: list[Plan]) -> None:
        """Take up answers."""
        for plan in plans:
            due_s = time.monotonic()
            announced = plan.n_announced if plan.ending else 0
            for action in plan.actions:
                due_s += action.wait_s
                self._pieces.append(
                    Piece(due_s, action.data, last=action.last, n_announced=announced)
                )
            if plan.ending not in ("", "stall"):
                self._pieces.append(Piece(due_s, b"", last=False, ending=plan.ending))

    def first(self, timeout_s: float) -> Piece | None:
        """Return the piece at the front once it is due, None if that takes too long."""
        end_s = time.monotonic() + timeout_s
        while True:
            now_s = time.monotonic()
            if self._pieces and self._pieces[0].due_s <= now_s:
                return self._pieces[0]
            if now_s >= end_s or self._stopping.wait(POLL_S / 2):
                return None
            self.put(self._responder.due())

    def drop_first(self) -> None:
        """Forget the piece at the front."""
        self._pieces.popleft()

    def clear(self) -> None:
        """Forget all of them."""
        self._pieces.clear()
