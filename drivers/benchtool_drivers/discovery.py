"""What is connected: serial ports and USB instruments; the network only when asked.

Looking at the network calls out on every interface and takes seconds, so it is never done unasked.
"""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import suppress

from benchtool.frozen import frozen_record

_APPLICATION, _USBTMC = 0xFE, 0x03
"""USB-IF class codes of USBTMC: application specific, test and measurement."""


@frozen_record
class Found:
    """Something that may be an instrument.

    Attributes:
        resource: The name to open it by.
        kind: serial, usb or network.
        about: What it says of itself.
    """

    resource: str
    kind: str
    about: str


@frozen_record
class Looked:
    """What was found, and where was looked."""

    found: tuple[Found, ...]
    notes: tuple[str, ...]


def look_around(*, network: bool = False) -> Looked:
    """Return what is connected.

    Args:
        network: Whether to call out on the network.
    """
    notes: list[str] = []
    found = [*_serial_ports(notes), *_usb(notes)]
    if network:
        found += _network(notes)
    else:
        notes.append("network: not looked at; --network calls out on every interface (seconds)")
    return Looked(found=tuple(found), notes=tuple(notes))


def _serial_ports(notes: list[str]) -> Iterator[Found]:
    from serial.tools.list_ports import comports

    ports = sorted(comports())
    notes.append(f"serial ports: {len(ports)} that the system lists")
    for port in ports:
        about = port.description if port.description not in (None, "n/a") else "a serial port"
        yield Found(resource=f"ASRL{port.device}::INSTR", kind="serial", about=about)


def _usb(notes: list[str]) -> list[Found]:
    try:
        import usb.core
    except ImportError:
        notes.append("USB: not looked at; pip install 'benchtool[usb]' for instruments on USB")
        return []
    try:
        devices = list(usb.core.find(find_all=True, custom_match=_is_instrument))
    except (usb.core.NoBackendError, ValueError):
        notes.append("USB: not looked at; no libusb here: pip install 'benchtool[usb]' brings one")
        return []
    except usb.core.USBError as error:
        notes.append(f"USB: cannot be looked at: {error}")
        return []
    notes.append(f"USB: {len(devices)} measuring instruments (class USBTMC)")
    return [_of_device(device) for device in devices]


def _is_instrument(device: object) -> bool:
    return any(
        (interface.bInterfaceClass, interface.bInterfaceSubClass) == (_APPLICATION, _USBTMC)
        for configuration in device  # type: ignore[attr-defined]  # pyusb has no types
        for interface in configuration
    )


def _of_device(device: object) -> Found:
    vendor, product = device.idVendor, device.idProduct  # type: ignore[attr-defined]  # as above
    serial = about = ""
    with suppress(Exception):  # without the right to open it, it keeps its names to itself
        serial = device.serial_number or ""  # type: ignore[attr-defined]  # as above
        about = f"{device.manufacturer} {device.product}"  # type: ignore[attr-defined]  # as above
    resource = "::".join(["USB0", str(vendor), str(product), serial, "0", "INSTR"])
    return Found(
        resource=resource,
        kind="usb",
        about=about.strip() or "a measuring instrument; its name may be read with more rights",
    )


def _network(notes: list[str]) -> list[Found]:
    import pyvisa

    manager = pyvisa.ResourceManager("@py")
    try:
        names = manager.list_resources("TCPIP?*")
    except Exception as error:
        notes.append(f"network: cannot be looked at: {error}")
        return []
    finally:
        manager.close()
    notes.append(f"network: {len(names)} that answered the call (VXI-11, and mDNS if installed)")
    return [Found(resource=name, kind="network", about="answered the call") for name in names]
