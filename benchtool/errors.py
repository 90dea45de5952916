"""Every error benchtool raises on purpose.

The tree::

    BenchtoolError                what went wrong, where, and what to do next
    ├── UsageError                options that contradict each other or lack something
    │   └── UnitError                 a text that is no value of the unit asked for
    ├── InputError                a file that cannot be opened or written
    ├── CaptureError              a file that was opened
    │   ├── UnknownStructureError     no reader recognises it
    │   ├── AmbiguousStructureError   two readings are sound; the hint names the option
    │   └── MalformedCaptureError     recognised, but damaged; carries path and line
    ├── MeasurementError          the data do not hold what was asked of them
    ├── DesignError               the design file; carries every fault with its key and line
    ├── SolveError                no circuit of the given topology gives these times
    └── InstrumentError           a live instrument; carries the step the exchange stood at
        ├── NotConnectedError         it cannot be reached, or has gone away
        ├── InstrumentTimeoutError    no answer, or only a part of one, in time
        ├── ReplyError                an answer that is not what was to come
        ├── RefusedError              its error queue says that a command was not carried out
        ├── NoTriggerError            armed, but nothing was recorded
        └── DriverMissingError        a library that the connection needs is not installed

A board that fails is a result and never an exception.
"""

from __future__ import annotations

from typing import ClassVar

from benchtool.frozen import frozen_record


class BenchtoolError(Exception):
    """Base of all errors that benchtool raises on purpose.

    Args:
        message: What went wrong and where, one sentence.
        hint: What the user can do next, one sentence.
        code: Stable name of the error; the class's own where none is given.
    """

    default_code: ClassVar[str] = "error"

    def __init__(self, message: str, *, hint: str, code: str | None = None) -> None:
        super().__init__(message)
        self.message = message
        self.hint = hint
        self.code = code or self.default_code

    def __reduce__(self) -> tuple[object, ...]:
        return _revive, (type(self), self.args, self.__dict__)

    def __str__(self) -> str:
        return self.message


def _revive(
    kind: type[BenchtoolError], args: tuple[object, ...], state: dict[str, object]
) -> BenchtoolError:
    """Rebuild a pickled error without calling its keyword-only constructor."""
    error = kind.__new__(kind, *args)
    error.args = args
    error.__dict__.update(state)
    return error


class UsageError(BenchtoolError):
    """Options that contradict each other, or one that is missing."""

    default_code = "usage"


class UnitError(UsageError, ValueError):
    """A text that is not a value of the unit asked for."""

    default_code = "unit"


class InputError(BenchtoolError):
    """A file that cannot be opened or written."""

    default_code = "input"


class CaptureError(BenchtoolError):
    """A capture file that was opened but gives no capture."""

    default_code = "capture"


class UnknownStructureError(CaptureError):
    """No reader recognises the file."""

    default_code = "unknown-structure"


@frozen_record
class Way:
    """One way to settle an ambiguity: fields of the read options, and what they would mean."""

    options: tuple[tuple[str, str], ...]
    meaning: str


class AmbiguousStructureError(CaptureError):
    """Two readings of the file are both sound.

    Args:
        message: What is ambiguous.
        hint: The option that settles it.
        code: Stable name of the error.
        ways: Options that could settle it; those that do are named in place of ``hint``.
    """

    default_code = "ambiguous-structure"

    def __init__(
        self, message: str, *, hint: str, code: str | None = None, ways: tuple[Way, ...] = ()
    ) -> None:
        super().__init__(message, hint=hint, code=code)
        self.ways = ways


class MalformedCaptureError(CaptureError):
    """The structure is known but the content is damaged.

    Args:
        message: What is wrong.
        hint: What to do.
        path: Name of the file.
        line: Line (text) or byte offset (binary) of the damage, where known.
        code: Stable name of the error.
    """

    default_code = "malformed-capture"

    def __init__(
        self,
        message: str,
        *,
        hint: str,
        path: str = "",
        line: int | None = None,
        code: str | None = None,
    ) -> None:
        super().__init__(message, hint=hint, code=code)
        self.path = path
        self.line = line


class MeasurementError(BenchtoolError):
    """The data do not hold what was asked of them."""

    default_code = "no-measurement"


@frozen_record
class DesignFault:
    """One fault of a design file: where it is and what is wrong with it."""

    key: str
    message: str
    file: str = ""
    line: int | None = None
    near: str | None = None


class DesignError(BenchtoolError):
    """A design file with one or more faults.

    Args:
        message: Summary sentence.
        hint: What to do.
        faults: Every fault found, in file order.
        code: Stable name of the error.
    """

    default_code = "design"

    def __init__(
        self,
        message: str,
        *,
        hint: str,
        faults: tuple[DesignFault, ...] = (),
        code: str | None = None,
    ) -> None:
        super().__init__(message, hint=hint, code=code)
        self.faults = faults


class SolveError(BenchtoolError):
    """No circuit of the given topology gives the measured times."""

    default_code = "no-solution"


@frozen_record
class Step:
    """Where an exchange with an instrument stood.

    Attributes:
        resource: The connection, as the user named it.
        command: The command that was under way.
        expected: What was to come back.
        got: What came, its first bytes made printable.
        last_good: The last step that worked.
    """

    resource: str = ""
    command: str = ""
    expected: str = ""
    got: str = ""
    last_good: str = ""


class InstrumentError(BenchtoolError):
    """A live instrument that did not do what was asked of it.

    Args:
        message: What went wrong, one sentence.
        hint: What to do.
        step: Where the exchange stood.
        code: Stable name of the error.
    """

    default_code = "instrument-error"

    def __init__(
        self, message: str, *, hint: str, step: Step | None = None, code: str | None = None
    ) -> None:
        super().__init__(message, hint=hint, code=code)
        self.step = step or Step()


class NotConnectedError(InstrumentError):
    """The instrument cannot be reached, or has gone away."""

    default_code = "not-connected"


class InstrumentTimeoutError(InstrumentError):
    """No answer came in time, or only a part of one."""

    default_code = "instrument-timeout"


class ReplyError(InstrumentError):
    """An answer came that is not what was to come."""

    default_code = "instrument-reply"


class RefusedError(InstrumentError):
    """The error queue of the instrument says that a command was not carried out."""

    default_code = "instrument-refused"


class NoTriggerError(InstrumentError):
    """The acquisition was armed, but nothing was recorded in time."""

    default_code = "no-trigger"


class DriverMissingError(InstrumentError):
    """A library that the connection needs is not installed."""

    default_code = "driver-missing"
