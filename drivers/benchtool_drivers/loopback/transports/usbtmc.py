"""A USBTMC instrument as a backend of pyusb: all but libusb, the kernel and the cable.

Framing: USBTMC 1.0, tables 1 to 4 and 15 to 31; USB488 1.0, table 8. The identifiers are the ones
that pid.codes keeps free for tests.
"""

from __future__ import annotations

import struct
import threading
from collections.abc import Callable
from types import SimpleNamespace
from typing import Any, Final

import usb.backend
import usb.backend.libusb1
import usb.core

from benchtool_drivers.loopback.responder import Responder
from benchtool_drivers.loopback.transports.outbox import Outbox

VENDOR: Final = 0x1209
PRODUCT: Final = 0x0001
SERIAL: Final = "LOOP0001"
STRINGS = ("", "loopback", "simulated instrument", SERIAL)
PACKET_BYTES = 512
BULK_OUT, BULK_IN = 0x01, 0x82
MESSAGE_OUT, MESSAGE_IN = 1, 2
GET_DESCRIPTOR, ABORT_IN, CHECK_ABORT_IN, CAPABILITIES = 6, 3, 4, 7
STATUS_SUCCESS = 1
NO_DEVICE = 19  # ENODEV
TIMED_OUT = 110  # ETIMEDOUT


class UsbtmcTransport:
    """Plugs the instrument in by standing in for libusb."""

    def __init__(self) -> None:
        self._before: Callable[..., Any] | None = None
        self._stopping = threading.Event()

    def start(self, responder: Responder, port: int = 0) -> str:  # noqa: ARG002 - a port has no meaning here
        """Stand in for libusb, and have pyvisa-py look for it again where it had found none."""
        backend = UsbtmcBackend(responder, self._stopping)
        self._before = usb.backend.libusb1.get_backend
        usb.backend.libusb1.get_backend = lambda *_args, **_options: backend
        import pyvisa_py.usb  # noqa: F401 - registers its sessions

        return f"USB0::{VENDOR:#06x}::{PRODUCT:#06x}::{SERIAL}::0::INSTR"

    def stop(self) -> None:
        """Give libusb its place back."""
        self._stopping.set()
        if self._before is not None:
            usb.backend.libusb1.get_backend = self._before


class UsbtmcBackend(usb.backend.IBackend):  # type: ignore[misc]  # pyusb is not typed
    """What pyusb calls in place of libusb; the names and signatures are its own.

    Args:
        responder: What answers.
        stopping: Is set when nobody needs to wait any more.
    """

    def __init__(self, responder: Responder, stopping: threading.Event) -> None:
        self._responder = responder
        self._outbox = Outbox(responder, stopping)
        self._message = b""
        self._request: tuple[int, int] | None = None
        self._rest = memoryview(b"")
        self._aborted = False
        self.plugged = True
        self._opened = False

    def enumerate_devices(self) -> list[str]:
        """List the one device."""
        return ["device"] if self.plugged else []

    def get_parent(self, _device: Any) -> None:
        """Know no hub."""

    def get_device_descriptor(self, _device: Any) -> SimpleNamespace:
        """Describe the device."""
        return SimpleNamespace(
            bLength=18,
            bDescriptorType=1,
            bcdUSB=0x0200,
            bDeviceClass=0,
            bDeviceSubClass=0,
            bDeviceProtocol=0,
            bMaxPacketSize0=64,
            idVendor=VENDOR,
            idProduct=PRODUCT,
            bcdDevice=0x0100,
            iManufacturer=1,
            iProduct=2,
            iSerialNumber=3,
            bNumConfigurations=1,
            address=1,
            bus=1,
            port_number=1,
            port_numbers=(1,),
            speed=3,
        )

    def get_configuration_descriptor(self, _device: Any, index: int) -> SimpleNamespace:
        """Describe its one configuration."""
        _only(index)
        return SimpleNamespace(
            bLength=9,
            bDescriptorType=2,
            wTotalLength=32,
            bNumInterfaces=1,
            bConfigurationValue=1,
            iConfiguration=0,
            bmAttributes=0x80,
            bMaxPower=50,
            extra_descriptors=[],
        )

    def get_interface_descriptor(
        self, _device: Any, interface: int, alternate: int, index: int
    ) -> SimpleNamespace:
        """Describe its one interface: class 0xFE, subclass 3, protocol USB488."""
        _only(interface, alternate, index)
        return SimpleNamespace(
            bLength=9,
            bDescriptorType=4,
            bInterfaceNumber=0,
            bAlternateSetting=0,
            bNumEndpoints=2,
            bInterfaceClass=0xFE,
            bInterfaceSubClass=3,
            bInterfaceProtocol=1,
            iInterface=0,
            extra_descriptors=[],
        )

    def get_endpoint_descriptor(
        self, _device: Any, endpoint: int, interface: int, alternate: int, index: int
    ) -> SimpleNamespace:
        """Describe its two bulk endpoints."""
        _only(interface, alternate, index)
        return SimpleNamespace(
            bLength=7,
            bDescriptorType=5,
            bmAttributes=2,
            bInterval=0,
            wMaxPacketSize=PACKET_BYTES,
            bRefresh=0,
            bSynchAddress=0,
            bEndpointAddress=(BULK_OUT, BULK_IN)[endpoint],
            extra_descriptors=[],
        )

    def open_device(self, _device: Any) -> str:
        """Open it."""
        if not self.plugged:
            raise _no_device()
        self._opened = True
        self._responder.clear()
        self._outbox.clear()
        return "handle"

    def close_device(self, _handle: Any) -> None:
        """Close it."""

    def set_configuration(self, _handle: Any, _value: int) -> None:
        """Accept the one configuration."""

    def get_configuration(self, _handle: Any) -> int:
        """Return the one configuration."""
        return 1

    def set_interface_altsetting(self, _handle: Any, _interface: int, _setting: int) -> None:
        """Accept the one setting."""

    def claim_interface(self, _handle: Any, _interface: int) -> None:
        """Let it be claimed."""
        self._still_there()

    def release_interface(self, _handle: Any, _interface: int) -> None:
        """Let it be released."""

    def is_kernel_driver_active(self, _handle: Any, _interface: int) -> bool:
        """Know no other driver."""
        return False

    def ctrl_transfer(
        self,
        _handle: Any,
        _kind: int,
        request: int,
        value: int,
        _index: int,
        data: Any,
        _timeout_ms: int,
    ) -> int:
        """Answer a request on the control endpoint."""
        self._still_there()
        if request == GET_DESCRIPTOR:
            return _fill(data, _string_descriptor(value & 0xFF))
        if request == CAPABILITIES:
            return _fill(data, bytes([STATUS_SUCCESS, *bytes(13), 4, *bytes(9)]))
        if request == ABORT_IN:
            self._aborted = True
            self._request = None
            self._rest = memoryview(b"")
        return _fill(data, bytes([STATUS_SUCCESS, *bytes(7)]))

    def bulk_write(
        self, _handle: Any, _endpoint: int, _interface: int, data: Any, _timeout_ms: int
    ) -> int:
        """Take a message, or the request for an answer."""
        self._still_there()
        raw = bytes(data)
        kind, tag, inverse, n_bytes, attributes = struct.unpack_from("<BBBxIB", raw)
        if tag ^ inverse != 0xFF or not tag:
            raise usb.core.USBError("the tag and its inverse do not fit", None, 32)
        if kind == MESSAGE_IN:
            self._request = (tag, n_bytes)
        elif kind == MESSAGE_OUT:
            self._take(raw[12 : 12 + n_bytes], last=bool(attributes & 1))
        return len(raw)

    def _take(self, piece: bytes, *, last: bool) -> None:
        self._message += piece
        if not last:
            return
        message, self._message = self._message, b""
        self._outbox.clear()  # a new command drops the old answer (USB488 1.0, 3.3)
        for line in message.rstrip(b"\r\n").split(b"\n"):
            self._outbox.put(self._responder.receive(line.rstrip(b"\r")))

    def bulk_read(
        self, _handle: Any, _endpoint: int, _interface: int, buffer: Any, timeout_ms: int
    ) -> int:
        """Give the next bytes of the answer that was requested."""
        self._still_there()
        if self._aborted:
            self._aborted = False
            return 0
        if not self._rest:
            self._rest = memoryview(self._transfer(timeout_ms / 1000))
        taken, self._rest = self._rest[: len(buffer)], self._rest[len(buffer) :]
        return _fill(buffer, taken)

    def _transfer(self, timeout_s: float) -> bytes:
        """Build the next transfer: a header, data, and bytes that make its length whole."""
        piece = self._outbox.first(timeout_s)
        if piece is not None and piece.ending:
            self.plugged = piece.ending != "unplug"
            self._opened = False  # one that comes back is another device to who had it open
            self._outbox.clear()
            raise _no_device()
        if piece is None or self._request is None:
            raise usb.core.USBTimeoutError("Operation timed out", -7, TIMED_OUT)
        tag, n_asked = self._request
        self._request = None
        data = piece.cut(n_asked)
        ended = piece.last and not piece.data
        if not piece.data:
            self._outbox.drop_first()
        n_said = min(piece.n_announced, n_asked) or len(data)
        head = struct.pack("<BBBxIB3x", MESSAGE_IN, tag, tag ^ 0xFF, n_said, int(ended))
        return b"".join((head, data, bytes(-len(data) % 4)))

    def _still_there(self) -> None:
        if not self._opened:
            raise _no_device()


def _no_device() -> Exception:
    text = "No such device (it may have been disconnected)"
    error: Exception = usb.core.USBError(text, -4, NO_DEVICE)
    return error


def _only(*indices: int) -> None:
    if any(indices):
        raise IndexError("there is only one")


def _string_descriptor(index: int) -> bytes:
    body = b"\x09\x04" if not index else STRINGS[index].encode("utf-16-le")
    return bytes([2 + len(body), 3]) + body


def _fill(buffer: Any, data: bytes | memoryview) -> int:
    n_bytes = min(len(buffer), len(data))
    memoryview(buffer).cast("B")[:n_bytes] = data[:n_bytes]
    return n_bytes
