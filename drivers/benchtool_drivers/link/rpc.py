"""Remote calls on the socket of a VXI-11 session (RFC 5531; records: section 11).

The library's own calls do not see that the other side has closed: they spin until a second after
the time limit. They also copy what comes five times and write it out in hexadecimal for a log that
nobody keeps.
"""

from __future__ import annotations

import socket
import struct
from typing import Any

CALL, VERSION, ACCEPTED, SUCCESS = 0, 2, 0, 0
LAST_FRAGMENT = 0x80000000
GRACE_S = 1.0
"""How much later than the instrument's own time limit an answer to a call may come."""


class Calls:
    """Makes calls, one at a time.

    Args:
        connection: The socket.
        client: The library's client on it, which goes on to make calls too: the serial numbers are
            taken from it.

    Attributes:
        within: Whether a reply was left half read.
    """

    def __init__(self, connection: socket.socket, client: Any) -> None:
        self._socket = connection
        self._client = client
        self._n_left = 0
        self._last = False
        self.within = False

    def begin(self, procedure: int, arguments: bytes, timeout_s: float) -> None:
        """Make a call, and read its reply up to the results; take those, then ``end`` it.

        Raises:
            TimeoutError: If there is no reply a second after the time limit.
            ConnectionError: If the other side has gone.
            OSError: If the call is not accepted.
        """
        self._client.lastxid += 1
        serial = self._client.lastxid
        program = (self._client.prog, self._client.vers)
        call = struct.pack("!10I", serial, CALL, VERSION, *program, procedure, 0, 0, 0, 0)
        call += arguments
        self._socket.settimeout(timeout_s + GRACE_S)
        self._socket.sendall(struct.pack("!I", LAST_FRAGMENT | len(call)) + call)
        while True:
            self._n_left, self._last = 0, False
            its_serial, _, state = self.numbers(3)
            if its_serial == serial:
                break
            self.end()  # the reply to a call that was given up
        if state != ACCEPTED:
            raise self._refused(state)
        _, n_verifier = self.numbers(2)
        self._take(memoryview(bytearray(_padded(n_verifier))))
        (state,) = self.numbers(1)
        if state != SUCCESS:
            raise self._refused(state)

    def _refused(self, state: int) -> OSError:
        self.end()
        return OSError(f"the instrument does not accept the call ({state})")

    def numbers(self, count: int) -> tuple[int, ...]:
        """Take so many numbers off the reply."""
        raw = bytearray(4 * count)
        self._take(memoryview(raw))
        return struct.unpack(f"!{count}I", raw)

    def data_into(self, view: memoryview) -> int:
        """Take counted bytes off the reply; return how many."""
        (n_bytes,) = self.numbers(1)
        if n_bytes > len(view):
            raise OSError("the instrument sends more than was asked for")
        self._take(view[:n_bytes])
        return n_bytes

    def end(self) -> None:
        """Drop what is left of the reply."""
        scrap = memoryview(bytearray(1 << 12))
        while self._n_left or not self._last:
            if not self._n_left:
                self._next_fragment()
            else:
                self._n_left -= self._received(scrap[: self._n_left])
        self.within = False

    def _take(self, view: memoryview) -> None:
        while view:
            if not self._n_left:
                self._next_fragment()
                continue
            n_read = self._received(view[: self._n_left])
            self._n_left -= n_read
            view = view[n_read:]

    def _next_fragment(self) -> None:
        if self._last:
            raise OSError("a reply of the instrument is shorter than it must be")
        head = bytearray(4)
        n_read = 0
        while n_read < 4:
            n_read += self._received(memoryview(head)[n_read:])
        (marked,) = struct.unpack("!I", head)
        self._n_left = marked & ~LAST_FRAGMENT
        self._last = bool(marked & LAST_FRAGMENT)

    def _received(self, view: memoryview) -> int:
        n_read = self._socket.recv_into(view)
        if not n_read:
            raise ConnectionError("the instrument closed the connection")
        self.within = True
        return n_read


def _padded(n_bytes: int) -> int:
    return (n_bytes + 3) & ~3
