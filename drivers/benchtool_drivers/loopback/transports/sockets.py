"""A raw TCP port, as ``TCPIP::host::port::SOCKET`` reaches it."""

from __future__ import annotations

import select
import socket

from benchtool_drivers.loopback.responder import Responder
from benchtool_drivers.loopback.transports.listening import HOST, Listener, reset
from benchtool_drivers.loopback.transports.streams import serve_stream


class SocketChannel:
    """A stream of bytes over a TCP connection.

    Args:
        connection: The connection.
        listener: What accepted it; it accepts no more once the instrument is unplugged.
    """

    def __init__(self, connection: socket.socket, listener: Listener) -> None:
        self._connection = connection
        self._listener = listener

    def receive(self, timeout_s: float) -> bytes | None:
        """Return what came."""
        readable, _, _ = select.select([self._connection], [], [], timeout_s)
        return self._connection.recv(1 << 16) if readable else None

    def send(self, data: bytes) -> None:
        """Send all of it."""
        self._connection.sendall(data)

    def end(self, ending: str) -> None:
        """Close or reset; unplugging also gives the port up."""
        if ending == "unplug":
            self._listener.give_up()
        if ending == "reset":
            reset(self._connection)
        else:
            self._connection.close()


class SocketTransport:
    """Serves one connection at a time; a new one ends the one before."""

    def __init__(self) -> None:
        self._listener: Listener | None = None

    def start(self, responder: Responder, port: int = 0) -> str:
        """Begin to listen."""

        def serve(connection: socket.socket) -> None:
            listener.end_others(connection)
            responder.clear()
            serve_stream(SocketChannel(connection, listener), responder, listener.stopping)

        listener = self._listener = Listener(serve, port)
        return f"TCPIP::{HOST}::{listener.port}::SOCKET"

    def stop(self) -> None:
        """Stop listening."""
        if self._listener is not None:
            self._listener.stop()
