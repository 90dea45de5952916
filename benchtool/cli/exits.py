"""Exit codes: 1 means a bad board and nothing else."""

from __future__ import annotations

from benchtool.errors import (
    AmbiguousStructureError,
    BenchtoolError,
    CaptureError,
    DesignError,
    InputError,
    InstrumentError,
    MeasurementError,
    SolveError,
    UnknownStructureError,
    UsageError,
)

OK = 0
FAIL = 1
USAGE = 2
UNDECIDED = 3
UNUSABLE = 4
INSTRUMENT = 5
DESIGN = 6
INTERNAL = 70
INTERRUPTED = 130
PIPE_CLOSED = 141

_BY_ERROR: dict[type[BenchtoolError], int] = {
    UsageError: USAGE,
    InputError: USAGE,
    UnknownStructureError: USAGE,
    AmbiguousStructureError: USAGE,
    CaptureError: UNUSABLE,
    MeasurementError: UNUSABLE,
    SolveError: UNUSABLE,
    DesignError: DESIGN,
    InstrumentError: INSTRUMENT,
}

BY_VERDICT: dict[str | None, int] = {
    None: OK,
    "pass": OK,
    "conditional-pass": UNDECIDED,
    "conditional-fail": UNDECIDED,
    "undecided": UNDECIDED,
    "fail": FAIL,
    "unusable": UNUSABLE,
}


def exit_code(error: BenchtoolError) -> int:
    """Return the exit code of an error: that of the nearest class in the table."""
    return next((_BY_ERROR[kind] for kind in type(error).__mro__ if kind in _BY_ERROR), INTERNAL)
