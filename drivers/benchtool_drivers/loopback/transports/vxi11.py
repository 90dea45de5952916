"""VXI-11 on any port, as ``TCPIP::host,port::INSTR`` reaches it: no port mapper is asked.

Procedures: VXI-11 revision 1.0, appendix C. Calls: RFC 5531 (records, section 11).
"""

from __future__ import annotations

import select
import socket
import struct

from benchtool_drivers.loopback.responder import Responder
from benchtool_drivers.loopback.transports.listening import HOST, Listener, exactly, reset
from benchtool_drivers.loopback.transports.outbox import Outbox

CREATE_LINK, WRITE, READ, READ_STATUS, CLEAR = 10, 11, 12, 13, 15
END_FLAG = 8
COUNT_REACHED, END = 1, 4
NO_ERROR, IO_TIMEOUT = 0, 15
LONGEST_PIECE = 1 << 20


class Vxi11Transport:
    """Serves one link at a time; a new one ends the one before."""

    def __init__(self) -> None:
        self._listener: Listener | None = None

    def start(self, responder: Responder, port: int = 0) -> str:
        """Begin to listen."""

        def serve(connection: socket.socket) -> None:
            listener.end_others(connection)
            responder.clear()
            _Calls(connection, responder, listener).run()

        listener = self._listener = Listener(serve, port)
        return f"TCPIP::{HOST},{listener.port}::INSTR"

    def stop(self) -> None:
        """Stop listening."""
        if self._listener is not None:
            self._listener.stop()


class _Calls:
    """One connection, whose calls are answered in turn."""

    def __init__(self, connection: socket.socket, responder: Responder, listener: Listener) -> None:
        self._connection = connection
        self._responder = responder
        self._listener = listener
        self._outbox = Outbox(responder, listener.stopping)
        self._message = b""
        self._going = True

    def run(self) -> None:
        while self._going and not self._listener.stopping.is_set():
            readable, _, _ = select.select([self._connection], [], [], 0.05)
            if readable:
                self._answer(_record(self._connection))

    def _answer(self, call: bytes) -> None:
        serial, _, _, _, _, procedure = struct.unpack_from("!6I", call)
        at = 24
        for _ in range(2):  # credentials and verifier: a flavour, and so many bytes
            (n_bytes,) = struct.unpack_from("!I", call, at + 4)
            at += 8 + _padded(n_bytes)
        result = self._done(procedure, call[at:])
        if result is None:
            return
        head = struct.pack("!6I", serial, 1, 0, 0, 0, 0)  # a reply, accepted, without a verifier
        record = head + result
        self._connection.sendall(struct.pack("!I", 0x80000000 | len(record)) + record)

    def _done(self, procedure: int, arguments: bytes) -> bytes | None:
        """Return the result of a call, None where none is given any more."""
        if procedure == CREATE_LINK:
            return struct.pack("!4I", NO_ERROR, 1, 0, LONGEST_PIECE)
        if procedure == WRITE:
            return self._write(arguments)
        if procedure == READ:
            return self._read(arguments)
        if procedure == READ_STATUS:
            return struct.pack("!2I", NO_ERROR, 0)
        if procedure == CLEAR:
            self._outbox.clear()
            self._message = b""
            self._responder.clear()
        return struct.pack("!I", NO_ERROR)

    def _write(self, arguments: bytes) -> bytes:
        _, _, _, flags, n_bytes = struct.unpack_from("!5I", arguments)
        self._message += arguments[20 : 20 + n_bytes]
        if flags & END_FLAG:
            message, self._message = self._message, b""
            for line in message.rstrip(b"\r\n").split(b"\n"):
                self._outbox.put(self._responder.receive(line.rstrip(b"\r")))
        return struct.pack("!2I", NO_ERROR, n_bytes)

    def _read(self, arguments: bytes) -> bytes | None:
        """Give what is there; wait for it at most as long as the caller says."""
        _, n_asked, io_timeout_ms = struct.unpack_from("!3I", arguments)
        piece = self._outbox.first(io_timeout_ms / 1000)
        if piece is None:
            return _read_result(IO_TIMEOUT, 0, memoryview(b""))
        if piece.ending:
            self._end(piece.ending)
            return None
        data = piece.cut(n_asked)
        if piece.data:
            return _read_result(NO_ERROR, COUNT_REACHED, data)
        self._outbox.drop_first()
        return _read_result(NO_ERROR, END if piece.last else 0, data)

    def _end(self, ending: str) -> None:
        self._going = False
        if ending == "unplug":
            self._listener.give_up()
        if ending == "reset":
            reset(self._connection)
        else:
            self._connection.close()


def _read_result(error: int, reason: int, data: memoryview) -> bytes:
    padding = bytes(_padded(len(data)) - len(data))
    return b"".join((struct.pack("!3I", error, reason, len(data)), data, padding))


def _padded(n_bytes: int) -> int:
    return (n_bytes + 3) & ~3


def _record(connection: socket.socket) -> bytes:
    """Return the next record, which may come in several fragments."""
    record = b""
    while True:
        (head,) = struct.unpack("!I", exactly(connection, 4))
        record += exactly(connection, head & 0x7FFFFFFF)
        if head & 0x80000000:
            return record
