"""A serial port: pyvisa opens it, the bytes are read off its pyserial port.

The library's own read fetches one byte a call (0.2 MB/s).
"""

from __future__ import annotations

import contextlib
import time
from typing import Any


class SerialWire:
    """A wire on the port of a pyvisa session.

    Args:
        resource: The opened pyvisa resource, closed together with the wire.
        port: Its pyserial port.
    """

    has_end = False
    can_clear = False
    broken = False

    def __init__(self, resource: Any, port: Any) -> None:
        self._resource = resource
        self._port = port

    def write(self, data: bytes, timeout_s: float) -> None:
        """Send all of it."""
        self._port.write_timeout = timeout_s
        self._port.write(data)

    def read_into(self, view: memoryview, timeout_s: float) -> tuple[int, bool]:
        """Read what is there, waiting for the first byte.

        Small reads lose least: what a call has collected when the line hangs up is gone with it.
        """
        end_s = time.monotonic() + timeout_s
        while True:
            n_waiting = self._port.in_waiting
            self._port.timeout = min(0.05, max(0.0, end_s - time.monotonic()))
            piece = self._port.read(min(max(1, n_waiting), len(view)))
            if piece:
                view[: len(piece)] = piece
                return len(piece), False
            if time.monotonic() >= end_s:
                raise TimeoutError("nothing came")

    def unasked(self) -> bool:
        """Look whether bytes have come unasked."""
        return bool(self._port.in_waiting)

    def gone(self) -> bool:
        """Ask the port for its state, which fails once the line has hung up."""
        try:
            self._port.in_waiting  # noqa: B018 - a property that asks the system
        except OSError:
            return True
        return False

    def clear(self) -> None:
        """Do nothing: a serial line has no device clear."""

    def close(self) -> None:
        """Close the port."""
        with contextlib.suppress(Exception):
            self._resource.close()
        with contextlib.suppress(Exception):
            self._port.close()
