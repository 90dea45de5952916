"""Serving a simulated instrument in this process, over a transport, on a free port.

``serve`` is for tests and for anything that needs an instrument for a while; ``serve_forever`` for
somebody who wants to try live commands with nothing attached.
"""

from __future__ import annotations

import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from importlib import import_module
from typing import Protocol, cast

from benchtool_drivers.loopback.faults import TransportFault
from benchtool_drivers.loopback.responder import Responder, Subject

_ROOM = "benchtool_drivers.loopback.transports"
TRANSPORTS = {
    "socket": f"{_ROOM}.sockets:SocketTransport",
    "hislip": f"{_ROOM}.hislip:HislipTransport",
    "vxi11": f"{_ROOM}.vxi11:Vxi11Transport",
    "pty": f"{_ROOM}.terminals:TerminalTransport",
    "usbtmc": f"{_ROOM}.usbtmc:UsbtmcTransport",
}
"""Name of a transport, and where its class is."""


class Transport(Protocol):
    """A transport that serves a responder from threads of its own."""

    def start(self, responder: Responder, port: int = 0) -> str:
        """Begin to serve; return the VISA resource string to reach it by."""
        ...

    def stop(self) -> None:
        """Stop, and wait until all threads have ended."""
        ...


def _made(transport: str) -> Transport:
    if transport not in TRANSPORTS:
        raise ValueError(f"no transport is called {transport!r}: {', '.join(TRANSPORTS)}")
    module, name = TRANSPORTS[transport].split(":")
    return cast("Transport", getattr(import_module(module), name)())


@contextmanager
def serve(
    subject: Subject, transport: str, fault: TransportFault | None = None, *, port: int = 0
) -> Iterator[str]:
    """Serve a subject, and yield the VISA resource string to reach it by.

    Args:
        subject: What answers.
        transport: Its name in ``TRANSPORTS``.
        fault: What goes wrong on the way, None for nothing.
        port: The TCP port, 0 for a free one.
    """
    made = _made(transport)
    try:
        yield made.start(Responder(subject, fault), port)
    finally:
        made.stop()


def serve_forever(
    subject: Subject,
    transport: str,
    announce: Callable[[str], None],
    *,
    fault: TransportFault | None = None,
    port: int = 0,
) -> None:
    """Serve a subject until the user interrupts.

    Args:
        subject: What answers.
        transport: Its name in ``TRANSPORTS``.
        announce: Is told the resource string once it can be reached.
        fault: What goes wrong on the way, None for nothing.
        port: The TCP port, 0 for a free one.
    """
    with suppress(KeyboardInterrupt), serve(subject, transport, fault, port=port) as resource:
        announce(resource)
        for_ever = threading.Event()
        while not for_ever.wait(3600.0):
            pass
