"""Times given as plain figures in place of a capture."""

from __future__ import annotations

import math
import re
from decimal import Decimal, InvalidOperation

from benchtool.cli.options import positive
from benchtool.errors import UsageError
from benchtool.model.quantity import Contribution, Measured, Notice
from benchtool.model.timing import Timing
from benchtool.uncertainty import combine

_OPTIONS = {
    "t_high": "--high",
    "t_low": "--low",
    "period": "--period",
    "duty": "--duty",
    "first_high": "--first",
    "delay": "--delay",
}
_NUMBER = re.compile(r"\d*\.?\d+(?:[eE][-+]?\d+)?")


def timing_from_figures(**texts: str | None) -> Timing:
    """Return timing from texts such as ``t_high="14.01s"``.

    A figure's uncertainty is the rounding of its last digit, rectangular (JCGM 100 F.2.2.1); a
    warning says so, since an instrument's own error adds to it.

    Args:
        texts: Name of a timing quantity to its text, None where it was not given.

    Raises:
        UsageError: If a text is no positive value of its unit, or none was given.
    """
    given = {name: text for name, text in texts.items() if text is not None}
    if not given:
        raise UsageError(
            "there is nothing to solve", hint="Give a capture file, or --high and --low."
        )
    figures = {name: _measured(name, text) for name, text in given.items()}
    notice = Notice(
        code="assumed-last-digit",
        text="the figures are taken to be good to their last digit and no better",
    )
    return Timing(**figures, warnings=(notice,))


def _measured(name: str, text: str) -> Measured:
    unit = "1" if name == "duty" else "s"
    value = positive(_OPTIONS[name], text, unit) or 0.0
    u = value * _last_digit_rel(text) / math.sqrt(12)
    return combine(value, unit, [Contribution(source=f"last digit of {name}", u=u)])


def _last_digit_rel(text: str) -> float:
    """Return one step of the last printed digit, relative to the number; 0 where unclear."""
    found = _NUMBER.search(text)
    if found is None:
        return 0.0
    try:
        number = Decimal(found.group())
    except InvalidOperation:
        return 0.0
    exponent = number.as_tuple().exponent
    if not number or not isinstance(exponent, int):
        return 0.0
    return float(Decimal(1).scaleb(exponent) / number)
