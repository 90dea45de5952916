"""What a resource string says of its address, looked at before and after a connection is tried."""

from __future__ import annotations

import re
import socket

from benchtool.errors import UsageError

_LARGEST_PORT = 65535
_FORMS = (
    "Write it as TCPIP::192.0.2.7::hislip0::INSTR, TCPIP::192.0.2.7::INSTR, "
    "TCPIP::192.0.2.7::5025::SOCKET, ASRL/dev/ttyUSB0::INSTR, or as `benchtool instruments list` "
    "shows it."
)
_HOST = re.compile(r"TCPIP\d*::([^:,]+)", re.IGNORECASE)
_PORT = re.compile(r"TCPIP\d*::(?:[^:]+::([^:]*)::SOCKET|.*,([^:,]*)::INSTR)", re.IGNORECASE)


def check_resource(resource: str) -> None:
    """Refuse what is no resource string at all, before anything is opened.

    Raises:
        UsageError: ``malformed-resource``: If it is none, or its port cannot be one.
    """
    from pyvisa.rname import InvalidResourceName, parse_resource_name

    try:
        parse_resource_name(resource)
    except InvalidResourceName:
        raise _malformed(f"{resource!r} is no resource string") from None
    found = _PORT.fullmatch(resource)
    port = (found[1] if found[1] is not None else found[2]) if found else None
    if port is not None and not (port.isdecimal() and 1 <= int(port) <= _LARGEST_PORT):
        raise _malformed(
            f"{resource!r}: {port!r} is no port: ports are numbers from 1 to {_LARGEST_PORT}"
        )


def unknown_host(resource: str) -> str | None:
    """Return the name in a resource string that stands for no address, None where it does."""
    found = _HOST.match(resource)
    if found is None:
        return None
    try:
        socket.getaddrinfo(found[1], None)
    except (OSError, UnicodeError):
        return found[1]
    return None


def _malformed(message: str) -> UsageError:
    return UsageError(message, hint=_FORMS, code="malformed-resource")
