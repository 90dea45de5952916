"""From a resource string to an open wire."""

from __future__ import annotations

import socket
import sys
from contextlib import redirect_stdout
from functools import cache
from typing import Any

from benchtool_drivers.link.hislip import HislipWire
from benchtool_drivers.link.serial_wire import SerialWire
from benchtool_drivers.link.sessions import SessionWire
from benchtool_drivers.link.sockets import SocketWire
from benchtool_drivers.link.usbtmc import UsbtmcWire
from benchtool_drivers.link.vxi11 import Vxi11Wire
from benchtool_drivers.link.wire import Wire


@cache
def _resources() -> Any:
    """Return pyvisa's resource manager on its pure Python library."""
    import pyvisa

    return pyvisa.ResourceManager("@py")


def connect(resource: str, timeout_s: float, baud: int | None = None) -> Wire:
    """Open a connection.

    Args:
        resource: A VISA resource string.
        timeout_s: How long to wait for the other side.
        baud: Rate of a serial line, None for the library's own.

    Raises:
        Exception: Whatever the library raises, bare ``Exception`` among it.
    """
    timeout_ms = max(1, int(timeout_s * 1000))
    try:
        with redirect_stdout(sys.stderr):  # a HiSLIP session may print a remark of its own
            opened = _resources().open_resource(resource, open_timeout=timeout_ms)
    except Exception as error:
        _close_leftovers(error)
        raise
    opened.timeout = timeout_ms
    session = opened.visalib.sessions[opened.session]
    carrier: Any = getattr(session, "interface", None)
    if resource.upper().endswith("::SOCKET") and isinstance(carrier, socket.socket):
        return SocketWire(opened, carrier)
    if hasattr(carrier, "in_waiting"):
        if baud is not None:
            carrier.baudrate = baud
        return SerialWire(opened, carrier)
    if isinstance(getattr(carrier, "_sync", None), socket.socket):
        return HislipWire(opened, session)
    if hasattr(carrier, "usb_recv_ep"):
        return UsbtmcWire(opened, session)
    if isinstance(getattr(carrier, "sock", None), socket.socket):
        return Vxi11Wire(opened, session)
    return SessionWire(opened, session)


def _close_leftovers(error: Exception) -> None:
    """Close what the library left open where opening failed: its frames still hold it."""
    cause: BaseException | None = error
    while cause is not None:
        trace = cause.__traceback__
        while trace is not None:
            for found in trace.tb_frame.f_locals.values():
                for name in ("_sync", "_async", "sock", "interface"):
                    carrier = getattr(found, name, None)
                    if isinstance(carrier, socket.socket):
                        carrier.close()
            trace = trace.tb_next
        cause = cause.__cause__ or cause.__context__
