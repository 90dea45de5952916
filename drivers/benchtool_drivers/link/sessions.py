"""A session that is read through the library: whatever has no wire of its own.

Reads go to the session's own ``read``, which returns what it has together with a status; the
reading functions that pyvisa builds on it spin for ever where a message ends before the count that
was asked for.
"""

from __future__ import annotations

import contextlib
import select
import socket
from typing import Any

from benchtool_drivers.link.foreign import raise_for_status

LARGEST_BYTES = 1 << 20
"""Larger reads gain nothing, and allocate what they ask for."""


class SessionWire:
    """A wire on a pyvisa session whose transport marks the end of an answer.

    Args:
        resource: The opened pyvisa resource, closed together with the wire.
        session: The session behind it.
    """

    has_end = True
    can_clear = False

    def __init__(self, resource: Any, session: Any) -> None:
        self._resource = resource
        self._session = session
        self._timeout_ms = -1
        self.broken = False

    def write(self, data: bytes, timeout_s: float) -> None:
        """Send all of it as one message."""
        self.limit(timeout_s)
        _, status = self._session.write(data)
        self.check(int(status))

    def read_into(self, view: memoryview, timeout_s: float) -> tuple[int, bool]:
        """Read a piece of the answer; one shorter than what was asked for ends it.

        Ask for more than is to come: a library that gives just what was asked for does not say
        whether that was the end.
        """
        self.limit(timeout_s)
        n_asked = min(len(view), LARGEST_BYTES)
        piece, status = self._session.read(n_asked)
        self.check(int(status))
        view[: len(piece)] = piece
        return len(piece), len(piece) < n_asked

    def check(self, status: int) -> None:
        """Raise for a status below zero."""
        if status < 0:
            if self.gone():
                raise ConnectionError("the instrument closed the connection")
            raise_for_status(status)

    def limit(self, timeout_s: float) -> None:
        """Set the time limit of the next reads and writes; never none at all."""
        timeout_ms = max(1, int(timeout_s * 1000))
        if timeout_ms != self._timeout_ms:
            self._resource.timeout = self._timeout_ms = timeout_ms

    def unasked(self) -> bool:
        """Know nothing: what was not asked for stays in the instrument."""
        return False

    def carrier(self) -> socket.socket | None:
        """Return the socket beneath, where there is one."""
        return None

    def gone(self) -> bool:
        """Look at the socket beneath for the end of its stream."""
        carrier = self.carrier()
        if carrier is None:
            return False
        try:
            readable, _, _ = select.select([carrier], [], [], 0.0)
            return bool(readable) and carrier.recv(1, socket.MSG_PEEK) == b""
        except (OSError, ValueError):
            return True

    def clear(self) -> None:
        """Do nothing: not every session has a device clear."""

    def close(self) -> None:
        """Close the session, without a word where the other side no longer answers."""
        carrier = self.carrier()
        with contextlib.suppress(OSError):
            if carrier is not None and (self.broken or self.gone()):
                carrier.shutdown(socket.SHUT_RDWR)
        with contextlib.suppress(Exception):
            self._resource.close()
        if carrier is not None:
            carrier.close()
