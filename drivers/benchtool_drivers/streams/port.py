"""A serial port, or what pyserial can treat as one, as a tap of bytes."""

from __future__ import annotations

import errno
import re
import select
import socket
import time
from typing import Any

from benchtool.errors import DriverMissingError, NotConnectedError, Step, UsageError
from benchtool_drivers.link.foreign import ours

CHUNK_BYTES = 1 << 16
_BETWEEN_LOOKS_S = 0.005

_REASONS = {
    errno.ENOENT: ("there is no such port", "see that it is plugged in, and how it is named"),
    errno.EACCES: (
        "it may not be opened",
        "ask for permission to use serial ports (on Linux the group that owns the port)",
    ),
    errno.EBUSY: ("another program has it open", "close the other program"),
    errno.ENOTTY: ("it is no serial port", "see how the port is named: benchtool instruments list"),
    socket.EAI_NONAME: (
        "no address is known for that name",
        "check how the name is written, or give its number, such as 192.0.2.7",
    ),
    errno.ECONNREFUSED: ("nobody answers there", "see that the other end listens"),
}


class PortTap:
    """Reads an open port without ever waiting inside the library.

    With a time-out of 0 a read of the library is one read of the system: what came before the
    line went dead is not thrown away, as it is when a longer read fails half-way.

    Args:
        port: An open port of pyserial, its time-out 0.
        name: As the user named it.
    """

    def __init__(self, port: Any, name: str) -> None:
        self._port = port
        self._name = name
        self._n_bytes = 0
        self._fileno = _fileno(port)

    def read(self, timeout_s: float) -> bytes:
        """Return what is there, or comes within the time.

        Raises:
            NotConnectedError: ``not-connected``: if the port has gone.
        """
        try:
            data = self._read(timeout_s)
        except Exception as error:
            if ours(error) is None:
                raise
            raise self._gone(error) from error
        self._n_bytes += len(data)
        return data

    def close(self) -> None:
        """Close the port."""
        try:
            self._port.close()
        except OSError:  # a port that was pulled out cannot be closed in order
            return

    def _read(self, timeout_s: float) -> bytes:
        if self._fileno is not None:
            if not select.select([self._fileno], [], [], timeout_s)[0]:
                return b""
            return bytes(self._port.read(CHUNK_BYTES))
        until = time.monotonic() + timeout_s
        while not (n := self._port.in_waiting):
            if time.monotonic() > until:
                return b""
            time.sleep(_BETWEEN_LOOKS_S)
        return bytes(self._port.read(min(n, CHUNK_BYTES)))

    def _gone(self, error: Exception) -> NotConnectedError:
        return NotConnectedError(
            f"{self._name} has gone: it was unplugged, or its other end closed it",
            hint="plug it in again and start anew; what was measured before stands",
            step=Step(
                resource=self._name,
                expected="lines",
                got=str(error),
                last_good=f"{self._n_bytes} bytes read",
            ),
        )


def _fileno(port: Any) -> int | None:
    """Return what the system can wait for, None where it has to be looked at again and again."""
    try:
        fileno = port.fileno()
        select.select([fileno], [], [], 0)
    except (AttributeError, OSError, ValueError, TypeError):
        return None
    return int(fileno)


def open_port(name: str, baud: int) -> PortTap:
    """Open a port by its name or its URL.

    Args:
        name: Such as ``/dev/ttyACM0``, ``COM3``, ``socket://host:port``, ``ASRL/dev/ttyS0::INSTR``.
        baud: Bits a second; without meaning for USB devices that are no adapters, and for sockets.

    Raises:
        DriverMissingError: If pyserial is not installed.
        NotConnectedError: If it cannot be opened.
        UsageError: If the speed or the URL is none.
    """
    try:
        import serial
    except ImportError as error:
        raise DriverMissingError(
            "serial ports need the library pyserial",
            hint="install it: python -m pip install pyserial",
            step=Step(resource=name),
        ) from error
    try:
        port = serial.serial_for_url(_url(name), baudrate=baud, timeout=0)
    except ValueError as error:
        raise UsageError(
            f"{name} cannot be opened as a serial port: {error}",
            hint="give a port such as /dev/ttyACM0 or COM3, a URL such as socket://host:port, "
            "and a speed that the port knows",
        ) from error
    except OSError as error:  # SerialException is one
        raise _not_opened(name, error) from error
    return PortTap(port, name)


def _url(name: str) -> str:
    """Return the port that a VISA resource string names."""
    if name.upper().startswith("ASRL") and name.upper().endswith("::INSTR"):
        bare = name[4:-7]
        return f"COM{bare}" if bare.isdigit() else bare
    if name.startswith(("socket://", "rfc2217://")) and not re.search(r":\d+(?:[/?].*)?$", name):
        raise UsageError(
            f"{name} names no port",
            hint="Write its number at the end: socket://192.0.2.9:7000.",
        )
    return name


def _not_opened(name: str, error: OSError) -> NotConnectedError:
    beneath = error.__context__
    number = error.errno or getattr(beneath, "errno", None) or 0
    if not number and beneath is not None and beneath.args and isinstance(beneath.args[0], int):
        number = beneath.args[0]
    if not number and "refused" in str(error).lower():
        number = errno.ECONNREFUSED
    says, hint = _REASONS.get(
        number, (str(error), "see that it is plugged in, and how it is named")
    )
    return NotConnectedError(
        f"{name} cannot be opened: {says}",
        hint=hint,
        step=Step(resource=name, command="open", got=str(error)),
    )
