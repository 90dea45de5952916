"""Errors of the libraries, and which of ours each becomes: the one table.

Names stand for classes so that the table loads none of the libraries. The nearest class among an
error's own and its bases counts.
"""

from __future__ import annotations

from benchtool.errors import (
    DriverMissingError,
    InstrumentError,
    InstrumentTimeoutError,
    NotConnectedError,
    ReplyError,
)

TABLE: dict[str, type[InstrumentError]] = {
    "builtins.TimeoutError": InstrumentTimeoutError,
    "builtins.ConnectionError": NotConnectedError,
    "builtins.OSError": NotConnectedError,
    "builtins.EOFError": NotConnectedError,
    "builtins.ImportError": DriverMissingError,
    # HiSLIP sessions raise this bare where the other side has gone, USB sessions the next.
    "builtins.RuntimeError": NotConnectedError,
    "builtins.ValueError": NotConnectedError,
    "builtins.AssertionError": ReplyError,
    "struct.error": ReplyError,
    "pyvisa.errors.Error": NotConnectedError,
    "pyvisa.errors.InvalidBinaryFormat": ReplyError,
    "pyvisa.errors.InvalidSession": NotConnectedError,
    "pyvisa.errors.LibraryError": DriverMissingError,
    "pyvisa.errors.OSNotSupported": DriverMissingError,
    "pyvisa.errors.UnknownHandler": NotConnectedError,
    "pyvisa.errors.VisaIOError": NotConnectedError,  # save a time limit, as below
    "pyvisa.errors.VisaIOWarning": ReplyError,
    "pyvisa.errors.VisaTypeError": ReplyError,
    "pyvisa.rname.InvalidResourceName": NotConnectedError,
    "pyvisa_py.sessions.OpenError": NotConnectedError,
    "pyvisa_py.sessions.UnknownAttribute": NotConnectedError,
    "pyvisa_py.protocols.rpc.RPCError": NotConnectedError,
    "pyvisa_py.protocols.rpc.RPCBadFormat": ReplyError,
    "pyvisa_py.protocols.rpc.RPCBadVersion": ReplyError,
    "pyvisa_py.protocols.rpc.RPCGarbageArgs": ReplyError,
    "pyvisa_py.protocols.rpc.RPCUnpackError": ReplyError,
    "pyvisa_py.protocols.vxi11.Vxi11Error": ReplyError,
    "pyvisa_py.protocols.xdrlib.Error": ReplyError,
    "pyvisa_py.protocols.xdrlib.ConversionError": ReplyError,
    "pyvisa_py.usb.USBTimeoutException": InstrumentTimeoutError,
    "serial.serialutil.SerialException": NotConnectedError,
    "serial.serialutil.SerialTimeoutException": InstrumentTimeoutError,
    "serial.serialutil.PortNotOpenError": NotConnectedError,
    "usb.core.NoBackendError": DriverMissingError,
    "usb.core.USBError": NotConnectedError,
    "usb.core.USBTimeoutError": InstrumentTimeoutError,
    "usb.libloader.LibraryException": DriverMissingError,
    "usb.libloader.LibraryMissingSymbolsException": DriverMissingError,
    "usb.libloader.LibraryNotFoundException": DriverMissingError,
    "usb.libloader.LibraryNotLoadedException": DriverMissingError,
    "usb.libloader.NoLibraryCandidatesException": DriverMissingError,
}


def ours(error: BaseException) -> type[InstrumentError] | None:
    """Return the class that a foreign error becomes, None for one that is not foreign."""
    if getattr(error, "error_code", None) == _TIMEOUT:
        return InstrumentTimeoutError
    for kind in type(error).__mro__:
        found = TABLE.get(f"{kind.__module__}.{kind.__qualname__}")
        if found is not None:
            return found
    return None


def raise_for_status(status: int) -> None:
    """Raise what a VISA status below zero stands for."""
    if status == _TIMEOUT:
        raise TimeoutError("nothing came")
    raise OSError(f"VISA status {status & 0xFFFFFFFF:#010x}")


_TIMEOUT = -1073807339
"""VI_ERROR_TMO (VPP-4.3, appendix A)."""
