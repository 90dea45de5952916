"""HiSLIP on any port, as ``TCPIP::host::hislip0,port::INSTR`` reaches it.

Message types and layout: IVI-6.1, tables 3 and 4. A client opens two connections: one carries
messages and answers, the other device clear and status.
"""

from __future__ import annotations

import select
import socket
import struct
import threading

from benchtool_drivers.loopback.faults import Plan
from benchtool_drivers.loopback.responder import Responder
from benchtool_drivers.loopback.transports.listening import HOST, Listener, exactly, reset
from benchtool_drivers.loopback.transports.streams import POLL_S

HEADER = struct.Struct("!2sBBIQ")
INITIALIZE, INITIALIZE_RESPONSE = 0, 1
DATA, DATA_END = 6, 7
CLEAR_COMPLETE, CLEAR_ACKNOWLEDGE = 8, 9
ASYNC_MAX_SIZE, ASYNC_MAX_SIZE_RESPONSE = 15, 16
ASYNC_INITIALIZE, ASYNC_INITIALIZE_RESPONSE = 17, 18
ASYNC_CLEAR, ASYNC_CLEAR_ACKNOWLEDGE = 19, 23
ASYNC_STATUS, ASYNC_STATUS_RESPONSE = 21, 22
LONGEST_PAYLOAD = (1 << 20) - HEADER.size


def frame(kind: int, payload: bytes = b"", *, control: int = 0, parameter: int = 0) -> bytes:
    """Return one message of the protocol."""
    return HEADER.pack(b"HS", kind, control, parameter, len(payload)) + payload


class HislipTransport:
    """Serves one client at a time; a new one ends the one before."""

    def __init__(self) -> None:
        self._listener: Listener | None = None
        self._responder: Responder | None = None
        self._clearing = threading.Event()
        self._session = 0

    def start(self, responder: Responder, port: int = 0) -> str:
        """Begin to listen."""
        self._responder = responder
        self._listener = Listener(self._serve, port)
        return f"TCPIP::{HOST}::hislip0,{self._listener.port}::INSTR"

    def stop(self) -> None:
        """Stop listening."""
        self._clearing.set()
        if self._listener is not None:
            self._listener.stop()

    def _serve(self, connection: socket.socket) -> None:
        """Serve one of a client's two connections, told apart by their first message."""
        assert self._listener is not None
        assert self._responder is not None
        kind, _, _, payload = _received(connection)
        if kind == INITIALIZE and payload:
            self._listener.end_others(connection)
            self._clearing.clear()
            self._responder.clear()
            self._session = (self._session + 1) & 0xFFFF
            parameter = 0x0100 << 16 | self._session  # version 1.0
            connection.sendall(frame(INITIALIZE_RESPONSE, parameter=parameter))
            _Messages(connection, self._responder, self._listener, self._clearing).run()
        elif kind == ASYNC_INITIALIZE:
            connection.sendall(frame(ASYNC_INITIALIZE_RESPONSE))
            self._serve_async(connection)

    def _serve_async(self, connection: socket.socket) -> None:
        assert self._responder is not None
        while True:
            kind, _, _, _ = _received(connection)
            if kind == ASYNC_CLEAR:
                self._clearing.set()
                self._responder.clear()
                connection.sendall(frame(ASYNC_CLEAR_ACKNOWLEDGE))
            elif kind == ASYNC_MAX_SIZE:
                size = struct.pack("!Q", LONGEST_PAYLOAD + HEADER.size)
                connection.sendall(frame(ASYNC_MAX_SIZE_RESPONSE, size))
            elif kind == ASYNC_STATUS:
                connection.sendall(frame(ASYNC_STATUS_RESPONSE))


class _Messages:
    """The connection that carries messages and answers."""

    def __init__(
        self,
        connection: socket.socket,
        responder: Responder,
        listener: Listener,
        clearing: threading.Event,
    ) -> None:
        self._connection = connection
        self._responder = responder
        self._listener = listener
        self._clearing = clearing
        self._id = 0
        self._message = b""

    def run(self) -> None:
        going = True
        while going and not self._listener.stopping.is_set():
            readable, _, _ = select.select([self._connection], [], [], POLL_S)
            plans = self._taken() if readable else self._responder.due()
            for plan in plans:
                going = going and self._carry_out(plan)

    def _taken(self) -> list[Plan]:
        kind, _, parameter, payload = _received(self._connection)
        if kind == CLEAR_COMPLETE:
            self._message = b""
            self._clearing.clear()
            self._connection.sendall(frame(CLEAR_ACKNOWLEDGE))
        elif kind in (DATA, DATA_END):
            self._id = parameter
            self._message += payload
        if kind != DATA_END:
            return []
        message, self._message = self._message, b""
        plans: list[Plan] = []
        for line in message.rstrip(b"\r\n").split(b"\n"):
            plans += self._responder.receive(line.rstrip(b"\r"))
        return plans

    def _carry_out(self, plan: Plan) -> bool:
        """Give one answer; return whether the connection goes on."""
        message_id = (self._id - 2) & 0xFFFFFFFF if plan.stale else self._id
        for action in plan.actions:
            if action.wait_s and self._clearing.wait(action.wait_s):
                return True
            if plan.ending:  # the header of the whole, and then only a part of it
                header = HEADER.pack(b"HS", DATA_END, 0, message_id, plan.n_announced)
                self._connection.sendall(header + action.data)
            else:
                self._send(action.data, message_id, last=action.last)
        return self._ended(plan.ending)

    def _send(self, data: bytes, message_id: int, *, last: bool) -> None:
        view = memoryview(data)
        while len(view) > LONGEST_PAYLOAD:
            self._put(DATA, view[:LONGEST_PAYLOAD], message_id)
            view = view[LONGEST_PAYLOAD:]
        self._put(DATA_END if last else DATA, view, message_id)

    def _put(self, kind: int, view: memoryview, message_id: int) -> None:
        self._connection.sendall(HEADER.pack(b"HS", kind, 0, message_id, len(view)))
        self._connection.sendall(view)

    def _ended(self, ending: str) -> bool:
        if ending in ("", "stall"):
            return True
        if ending == "unplug":
            self._listener.give_up()
        self._listener.end_others(self._connection)  # first: a client may come back at once
        if ending == "reset":
            reset(self._connection)
        else:
            self._connection.close()
        return False


def _received(connection: socket.socket) -> tuple[int, int, int, bytes]:
    """Return the next message: its type, control code, parameter and payload."""
    prologue, kind, control, parameter, n_bytes = HEADER.unpack(exactly(connection, HEADER.size))
    if prologue != b"HS":
        raise EOFError
    return kind, control, parameter, exactly(connection, n_bytes)
