"""Between a transport and what is behind it: messages in, plans of answers out."""

from __future__ import annotations

import re
import threading
from typing import Protocol

from benchtool_drivers.loopback.faults import Plan, TransportFault, healthy, struck


class Subject(Protocol):
    """What is behind a transport: it takes messages and gives answers.

    It is never called by two threads at once.
    """

    def receive(self, message: bytes) -> None:
        """Take one whole message, its terminator removed."""
        ...

    def output(self) -> bytes | None:
        """Return the next whole answer with its terminator, None where nothing is due (yet)."""
        ...

    def clear(self) -> None:
        """Do a device clear: forget what was asked and not yet fetched; settings stay."""
        ...


class Responder:
    """Hands messages to a subject, and strikes its answers with a fault.

    Args:
        subject: What answers.
        fault: What goes wrong on the way, None for nothing.
    """

    def __init__(self, subject: Subject, fault: TransportFault | None = None) -> None:
        self._subject = subject
        self._fault = fault
        self._left = fault.times if fault is not None else 0
        self._command = b""
        self._lock = threading.RLock()

    def receive(self, message: bytes) -> list[Plan]:
        """Take a message; return the answers that are due at once."""
        with self._lock:
            self._command = message
            self._subject.receive(message)
            return self.due()

    def due(self) -> list[Plan]:
        """Return the answers that are due by now."""
        plans: list[Plan] = []
        with self._lock:
            while (answer := self._subject.output()) is not None:
                plans += self._planned(answer)
        return plans

    def clear(self) -> None:
        """Do a device clear."""
        with self._lock:
            self._subject.clear()

    def _planned(self, answer: bytes) -> tuple[Plan, ...]:
        fault = self._fault
        if fault is None or self._left == 0:
            return (healthy(answer),)
        if not re.search(fault.on, self._command.decode("latin-1")):
            return (healthy(answer),)
        if self._left is not None:
            self._left -= 1
        return struck(fault, self._command, answer)
