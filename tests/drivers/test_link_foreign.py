"""Every exception class of the libraries becomes one of ours."""

from __future__ import annotations

import importlib
import inspect
import pkgutil
import warnings

import pytest

from benchtool.errors import (
    DriverMissingError,
    InstrumentTimeoutError,
    NotConnectedError,
    Step,
)
from benchtool_drivers.link.complaints import HINTS, complaint, unreachable
from benchtool_drivers.link.foreign import TABLE, ours

LIBRARIES = ("pyvisa", "pyvisa_py", "serial", "usb")


def exception_classes() -> dict[str, type[BaseException]]:
    """Return the exception classes that the libraries define, by their full names."""
    found: dict[str, type[BaseException]] = {}
    for library in LIBRARIES:
        package = importlib.import_module(library)
        names = [entry.name for entry in pkgutil.walk_packages(package.__path__, library + ".")]
        for name in [library, *names]:
            if "test" in name or name.endswith("__main__"):
                continue
            try:
                with warnings.catch_warnings(action="ignore"):
                    module = importlib.import_module(name)
            except (ImportError, OSError, ValueError, AttributeError):
                continue  # for another system, another version, or a library that is not there
            found |= {
                f"{kind.__module__}.{kind.__qualname__}": kind
                for kind in vars(module).values()
                if inspect.isclass(kind)
                and issubclass(kind, BaseException)
                and kind.__module__.split(".")[0] in LIBRARIES
            }
    return found


def test_the_walk_finds_the_classes_of_all_libraries() -> None:
    found = exception_classes()
    assert {name.split(".")[0] for name in found} == set(LIBRARIES)
    assert len(found) > 25


def test_no_exception_class_of_the_libraries_is_unmapped() -> None:
    assert not exception_classes().keys() - TABLE.keys()


def test_a_class_derived_from_a_mapped_one_is_mapped_like_it() -> None:
    class NewerError(ConnectionResetError):
        pass

    assert ours(NewerError()) is NotConnectedError
    assert ours(KeyError("a fault in the program")) is None


def test_a_time_limit_of_visa_is_told_from_its_other_errors() -> None:
    from pyvisa.constants import StatusCode
    from pyvisa.errors import VisaIOError

    assert ours(VisaIOError(StatusCode.error_timeout)) is InstrumentTimeoutError
    assert ours(VisaIOError(StatusCode.error_io)) is NotConnectedError


@pytest.mark.parametrize("kind", sorted(set(TABLE.values()), key=str))
def test_every_class_of_ours_in_the_table_has_a_hint(kind: type) -> None:
    assert kind in HINTS


def test_a_fault_in_the_program_is_not_taken_for_the_instruments() -> None:
    assert complaint(KeyError("x"), Step()) is None


@pytest.mark.parametrize(
    ("error", "kind"),
    [
        (ValueError("Please install PyUSB to use this resource type.\nmore"), DriverMissingError),
        (ModuleNotFoundError("No module named 'pyvisa'"), DriverMissingError),
        (ValueError("No device found."), NotConnectedError),
        (Exception("could not connect: error_timeout"), NotConnectedError),
    ],
)
def test_why_nothing_could_be_opened_is_told(error: Exception, kind: type) -> None:
    told = unreachable(error, "USB0::1::2::3::INSTR")
    assert type(told) is kind
    assert told is not None
    assert str(error).splitlines()[0].rstrip(".") in told.message
    assert told.step.resource == "USB0::1::2::3::INSTR"


def test_a_library_without_its_backend_is_told_as_missing(monkeypatch: pytest.MonkeyPatch) -> None:
    import usb.backend.libusb0
    import usb.backend.libusb1
    import usb.backend.openusb
    import usb.core

    for backend in (usb.backend.libusb0, usb.backend.libusb1, usb.backend.openusb):
        monkeypatch.setattr(backend, "get_backend", lambda *_args, **_options: None)
    with pytest.raises(usb.core.NoBackendError) as caught:
        usb.core.find()
    assert isinstance(unreachable(caught.value, "USB0::1::2::3::INSTR"), DriverMissingError)
