"""A VXI-11 session, written and read by remote calls of our own.

The library's own read repeats the call until the count is reached or the message ends, and takes
the whole time since its beginning off the time limit at each repetition, so that a slow answer
fails; and it does not tell an end that falls on the count. Calls: VXI-11 1.0, B.6.
"""

from __future__ import annotations

import socket
import struct
from typing import Any

from benchtool_drivers.link.rpc import Calls
from benchtool_drivers.link.sessions import LARGEST_BYTES, SessionWire

WRITE, READ, CLEAR = 11, 12, 15
END_OF_MESSAGE = 8  # table B.3: the flag of a write
END = 4  # table B.4: the reason of a read
NO_ERROR, IO_TIMEOUT = 0, 15  # table B.2
CLEAR_S = 1.0


class Vxi11Wire(SessionWire):
    """A wire on a VXI-11 session."""

    can_clear = True

    def __init__(self, resource: Any, session: Any) -> None:
        super().__init__(resource, session)
        self._socket: socket.socket = session.interface.sock
        self._calls = Calls(self._socket, session.interface)

    def carrier(self) -> socket.socket | None:
        """Return the socket of the calls."""
        return self._socket

    def write(self, data: bytes, timeout_s: float) -> None:
        """Send all of it as one message."""
        session = self._session
        size = min(session.max_recv_size, LARGEST_BYTES)
        for at in range(0, len(data), size):
            piece = data[at : at + size]
            flags = END_OF_MESSAGE if at + size >= len(data) else 0
            times = (_ms(timeout_s), session.lock_timeout)
            arguments = struct.pack("!iIIiI", session.link, *times, flags, len(piece))
            padding = bytes(-len(piece) % 4)
            error, n_taken = self._call(WRITE, arguments + piece + padding, timeout_s, 2)
            _check(error)
            if n_taken < len(piece):
                raise OSError("the instrument took a part of the command only")

    def read_into(self, view: memoryview, timeout_s: float) -> tuple[int, bool]:
        """Read what one call gives."""
        session = self._session
        n_asked = min(len(view), LARGEST_BYTES)
        times = (_ms(timeout_s), session.lock_timeout)
        arguments = struct.pack("!iIIIii", session.link, n_asked, *times, 0, 0)
        self._begin(READ, arguments, timeout_s)
        error, reason = self._calls.numbers(2)
        n_read = self._calls.data_into(view[:n_asked])
        self._end()
        ended = bool(reason & END)
        if not n_read and not ended:
            _check(error or IO_TIMEOUT)
        return n_read, ended

    def clear(self) -> None:
        """Do a device clear."""
        session = self._session
        arguments = struct.pack("!iiII", session.link, 0, session.lock_timeout, _ms(CLEAR_S))
        (error,) = self._call(CLEAR, arguments, CLEAR_S, 1)
        _check(error)

    def _call(
        self, procedure: int, arguments: bytes, timeout_s: float, n_results: int
    ) -> tuple[int, ...]:
        self._begin(procedure, arguments, timeout_s)
        results = self._calls.numbers(n_results)
        self._end()
        return results

    def _begin(self, procedure: int, arguments: bytes, timeout_s: float) -> None:
        self.broken = True  # until the reply has been read to its end
        try:
            self._calls.begin(procedure, arguments, timeout_s)
        except TimeoutError:
            self.broken = self._calls.within
            raise

    def _end(self) -> None:
        self._calls.end()
        self.broken = False


def _ms(seconds: float) -> int:
    return max(1, int(seconds * 1000))


def _check(error: int) -> None:
    if error == IO_TIMEOUT:
        raise TimeoutError("nothing came")
    if error != NO_ERROR:
        raise OSError(f"VXI-11 error {error}")
