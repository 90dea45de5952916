"""A TCP port on the loopback interface, each connection served by a thread of its own."""

from __future__ import annotations

import errno
import socket
import struct
import threading
from collections.abc import Callable
from contextlib import suppress

from benchtool.errors import UsageError

HOST = "127.0.0.1"
ACCEPT_S = 0.05


class Listener:
    """Accepts connections until it is stopped.

    Args:
        serve: Serves one connection until that has ended.
        port: The port, 0 for a free one.
    """

    def __init__(self, serve: Callable[[socket.socket], None], port: int = 0) -> None:
        self._serve = serve
        self._server = _bound(port)
        self._server.settimeout(ACCEPT_S)
        self.port: int = self._server.getsockname()[1]
        self.stopping = threading.Event()
        self._lock = threading.Lock()
        self._open: dict[socket.socket, threading.Thread] = {}
        self._thread = threading.Thread(target=self._accept, daemon=True)
        self._thread.start()

    def _accept(self) -> None:
        while not self.stopping.is_set():
            try:
                connection, _ = self._server.accept()
            except TimeoutError:
                continue
            except OSError:
                return
            connection.setblocking(True)
            connection.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
            thread = threading.Thread(target=self._run, args=(connection,), daemon=True)
            with self._lock:
                self._open[connection] = thread
            thread.start()

    def _run(self, connection: socket.socket) -> None:
        try:
            with suppress(OSError, EOFError):
                self._serve(connection)
        finally:
            connection.close()
            with self._lock:
                self._open.pop(connection, None)

    def end_others(self, connection: socket.socket) -> None:
        """End all connections but this one, and wait until they have ended."""
        with self._lock:
            others = [entry for entry in self._open.items() if entry[0] is not connection]
        for other, thread in others:
            with suppress(OSError):
                other.shutdown(socket.SHUT_RDWR)
            if thread is not threading.current_thread():
                thread.join(2.0)

    def give_up(self) -> None:
        """Accept no more; what is open goes on."""
        self.stopping.set()
        with suppress(OSError):
            self._server.shutdown(socket.SHUT_RDWR)  # ends the wait in accept at once
        self._server.close()

    def stop(self) -> None:
        """Accept no more, and end what is open."""
        self.give_up()
        self._thread.join(2.0)
        with self._lock:
            still_open = list(self._open.items())
        for connection, thread in still_open:
            with suppress(OSError):
                connection.shutdown(socket.SHUT_RDWR)
            thread.join(2.0)


def reset(connection: socket.socket) -> None:
    """Close so that the other side is told of a reset and not of an end."""
    with suppress(OSError):
        connection.setsockopt(socket.SOL_SOCKET, socket.SO_LINGER, struct.pack("ii", 1, 0))
    connection.close()


def exactly(connection: socket.socket, n_bytes: int) -> bytes:
    """Return the next bytes.

    Raises:
        EOFError: If the stream ends before.
    """
    buffer = bytearray(n_bytes)
    view = memoryview(buffer)
    n_got = 0
    while n_got < n_bytes:
        n_read = connection.recv_into(view[n_got:])
        if not n_read:
            raise EOFError
        n_got += n_read
    return bytes(buffer)


def _bound(port: int) -> socket.socket:
    """Take a port.

    Raises:
        UsageError: If that is not to be had.
    """
    try:
        return socket.create_server((HOST, port))
    except OSError as error:
        taken = error.errno == errno.EADDRINUSE
        raise UsageError(
            f"port {port} cannot be served: "
            + ("another program has it" if taken else str(error.strerror)),
            hint="Leave --port out for one that is free, or give another.",
        ) from error
