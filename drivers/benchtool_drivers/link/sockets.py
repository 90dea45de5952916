"""A raw TCP connection: pyvisa opens it, the bytes are read off its socket.

The library's own read gives one received piece of at most 4 KiB a turn, does not see that the
other side has closed (it spins until the timeout, and its clear for ever), and leaves Nagle's
algorithm on, which costs 40 ms for each pair of small writes. The socket itself has none of that.
"""

from __future__ import annotations

import contextlib
import os
import select
import socket
from typing import Any


class SocketWire:
    """A wire on the socket of a pyvisa session.

    Args:
        resource: The opened pyvisa resource, closed together with the wire.
        connection: Its socket.

    Raises:
        OSError: If nobody is there: the library opens a connection that was refused.
    """

    has_end = False
    can_clear = False
    broken = False

    def __init__(self, resource: Any, connection: socket.socket) -> None:
        self._resource = resource
        self._socket = connection
        if refusal := connection.getsockopt(socket.SOL_SOCKET, socket.SO_ERROR):
            self.close()
            raise OSError(refusal, os.strerror(refusal))
        with contextlib.suppress(OSError):
            connection.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)

    def write(self, data: bytes, timeout_s: float) -> None:
        """Send all of it."""
        self._socket.settimeout(timeout_s)
        self._socket.sendall(data)

    def read_into(self, view: memoryview, timeout_s: float) -> tuple[int, bool]:
        """Read what is there, waiting for the first byte."""
        self._socket.settimeout(timeout_s)
        n_bytes = self._socket.recv_into(view)
        if not n_bytes:
            raise ConnectionError("the instrument closed the connection")
        return n_bytes, False

    def unasked(self) -> bool:
        """Look whether bytes have come unasked."""
        return self._peek() is not None

    def gone(self) -> bool:
        """Look whether the stream has ended."""
        try:
            return self._peek() == b""
        except OSError:
            return True

    def _peek(self) -> bytes | None:
        """Return a byte that waits, an empty text at the end of the stream, None for neither."""
        readable, _, _ = select.select([self._socket], [], [], 0.0)
        return self._socket.recv(1, socket.MSG_PEEK) if readable else None

    def clear(self) -> None:
        """Do nothing: a raw connection has no device clear."""

    def close(self) -> None:
        """Close the connection."""
        with contextlib.suppress(Exception):
            self._resource.close()
        with contextlib.suppress(OSError):
            self._socket.close()
