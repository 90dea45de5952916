"""A HiSLIP session, its answers read off its synchronous socket.

The library's own read forgets where in a message it was when a time limit ends it, never returns
where more is asked for than the message holds, throws old answers away in a loop that does not end
if the connection does, and its device clear fails where an answer is still under way. Messages:
IVI-6.1, tables 3 and 4; device clear: 6.12.
"""

from __future__ import annotations

import socket
import struct
import time
from typing import Any

from benchtool_drivers.link.sessions import SessionWire
from benchtool_drivers.link.text import printable

HEADER = struct.Struct("!2sBBIQ")
FATAL_ERROR, ERROR = 2, 3
DATA, DATA_END, CLEAR_COMPLETE, CLEAR_ACKNOWLEDGE = 6, 7, 8, 9
ANY_MESSAGE = 0xFFFFFFFF
FIRST_MESSAGE = 0xFFFFFF00
CLEAR_S = 1.0
REST_S = 0.2
"""How long the rest of an answer that had stopped is waited for."""


class HislipWire(SessionWire):
    """A wire on a HiSLIP session."""

    can_clear = True

    def __init__(self, resource: Any, session: Any) -> None:
        super().__init__(resource, session)
        self._socket: socket.socket = session.interface._sync  # noqa: SLF001 - there is no other way to it
        self._header = bytearray()
        self._kind = 0
        self._n_left = 0

    def carrier(self) -> socket.socket | None:
        """Return the synchronous socket."""
        return self._socket

    def write(self, data: bytes, timeout_s: float) -> None:
        """Send all of it as one message."""
        self._kind = 0
        super().write(data, timeout_s)

    def read_into(self, view: memoryview, timeout_s: float) -> tuple[int, bool]:
        """Read what is there of the answer to the last command."""
        self._socket.settimeout(timeout_s)
        if not self._n_left:
            if self._kind == DATA_END:
                return 0, True
            self._next_answer(timeout_s)
        n_read = self._received(view[: self._n_left]) if self._n_left else 0
        self._n_left -= n_read
        ended = self._kind == DATA_END and not self._n_left
        if ended:
            self._session.interface._rmt = 1  # noqa: SLF001 - told to the instrument with the next command
        return n_read, ended

    def _next_answer(self, timeout_s: float) -> None:
        """Read headers until one belongs to the last command; what belongs to others is dropped."""
        end_s = time.monotonic() + timeout_s
        while True:
            kind, message_id, n_bytes = self._next_header()
            awaited = (self._session.interface.last_message_id, ANY_MESSAGE)
            if kind in (DATA, DATA_END) and message_id in awaited:
                self._kind, self._n_left = kind, n_bytes
                return
            if kind in (FATAL_ERROR, ERROR):
                raise ConnectionError(f"the instrument reports {self._told(n_bytes)}")
            self._drop(n_bytes)
            if time.monotonic() > end_s:
                raise TimeoutError("only old answers came")

    def _next_header(self) -> tuple[int, int, int]:
        """Return type, parameter and length; what came of it before a time limit is kept."""
        while len(self._header) < HEADER.size:
            piece = bytearray(HEADER.size - len(self._header))
            n_read = self._received(memoryview(piece))
            self._header += piece[:n_read]
        prologue, kind, _, parameter, n_bytes = HEADER.unpack(self._header)
        self._header.clear()
        if prologue != b"HS":
            self.broken = True
            raise ConnectionError("the instrument sends what is no HiSLIP message")
        return kind, parameter, n_bytes

    def _told(self, n_bytes: int) -> str:
        """Return the text of an error of the protocol, after which only a new connection helps."""
        self.broken = True
        text = bytearray(min(n_bytes, 200))
        n_read = self._received(memoryview(text)) if text else 0
        return printable(bytes(text[:n_read])) or "an error of the protocol"

    def _drop(self, n_bytes: int) -> None:
        scrap = memoryview(bytearray(min(n_bytes, 1 << 16)))
        while n_bytes:
            try:
                n_bytes -= self._received(scrap[:n_bytes])
            except TimeoutError:
                self.broken = True
                raise

    def _received(self, view: memoryview) -> int:
        n_read = self._socket.recv_into(view)
        if not n_read:
            raise ConnectionError("the instrument closed the connection")
        return n_read

    def clear(self) -> None:
        """Do a device clear, dropping whatever is still under way."""
        instrument = self._session.interface
        self.limit(CLEAR_S)
        features = instrument.async_device_clear()
        self._socket.settimeout(REST_S)
        self._socket.sendall(HEADER.pack(b"HS", CLEAR_COMPLETE, features, 0, 0))
        self._drop(self._n_left)
        self._n_left = 0
        kind = 0
        while kind != CLEAR_ACKNOWLEDGE:
            kind, _, n_bytes = self._next_header()
            self._drop(n_bytes)
        self._kind = 0
        instrument._message_id = FIRST_MESSAGE  # noqa: SLF001 - as the library's own clear does
