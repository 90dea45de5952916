"""A USBTMC session, read transfer by transfer.

The library's own read goes on to the end of the message whatever count was asked for, so that no
deadline can be kept, or throws away what is beyond the count, and it does not tell an end that
falls on the count. Framing: USBTMC 1.0, tables 1, 4 and 9.
"""

from __future__ import annotations

import contextlib
import errno
import struct
from typing import Any

from benchtool_drivers.link.sessions import LARGEST_BYTES, SessionWire

REQUEST = struct.Struct("<BBBxIBBxx")
HEADER = struct.Struct("<BBBxIBxxx")
MESSAGE_IN = 2
END_OF_MESSAGE = 1


class UsbtmcWire(SessionWire):
    """A wire on a USBTMC session."""

    def read_into(self, view: memoryview, timeout_s: float) -> tuple[int, bool]:
        """Read what one transfer gives."""
        self.limit(timeout_s)
        interface = self._session.interface
        tag = interface._btag = interface._btag % 255 + 1  # noqa: SLF001 - the library counts on there
        n_asked = min(len(view), LARGEST_BYTES)
        interface.usb_send_ep.write(
            REQUEST.pack(MESSAGE_IN, tag, tag ^ 0xFF, n_asked, 0, 0), interface.timeout
        )
        try:
            return self._transfer(view[:n_asked], tag, interface)
        except (OSError, ValueError) as error:
            with contextlib.suppress(OSError, ValueError):
                interface._abort_bulk_in(tag)  # noqa: SLF001 - or the endpoint stays halted
            if getattr(error, "errno", None) == errno.ETIMEDOUT:
                raise TimeoutError("nothing came") from error
            raise

    def _transfer(self, view: memoryview, tag: int, interface: Any) -> tuple[int, bool]:
        raw = self._packets(HEADER.size + len(view), interface)
        if len(raw) < HEADER.size:
            raise OSError("a USB transfer came without its header")
        kind, its_tag, inverse, n_said, attributes = HEADER.unpack_from(raw)
        if kind != MESSAGE_IN or (its_tag, inverse) != (tag, tag ^ 0xFF) or n_said > len(view):
            raise OSError("the header of a USB transfer is not the one that was asked for")
        piece = raw[HEADER.size : HEADER.size + n_said]
        n_got = len(piece)
        view[:n_got] = piece
        while n_got < n_said:
            piece = self._packets(n_said - n_got, interface)[: n_said - n_got]
            view[n_got : n_got + len(piece)] = piece
            n_got += len(piece)
        ended = bool(attributes & END_OF_MESSAGE)
        if not n_got and not ended:
            raise TimeoutError("nothing came")
        return n_got, ended

    def _packets(self, n_bytes: int, interface: Any) -> memoryview:
        """Read whole packets, one more than the bytes fill: a short one ends a transfer."""
        packet_bytes = interface.usb_recv_ep.wMaxPacketSize
        n_packets = n_bytes // packet_bytes + 1
        return memoryview(interface.usb_recv_ep.read(n_packets * packet_bytes, interface.timeout))
