"""Texts of the design file to SI values.

Every function raises ``ValueError`` for a text that is no such value, in plain words that the
fault of the design file repeats.
"""

from __future__ import annotations

import re
from collections.abc import Mapping

from benchtool.designs.vocabulary import BoundKind
from benchtool.errors import UnitError
from benchtool.model.design import Band, Threshold
from benchtool.units import parse, parse_tolerance

LIMIT_SOURCE = "design file"
"""Source of a limit that names none."""

ABSOLUTE_ZERO_C = -273.15
_LONGEST = 80  # characters of a value

_WITH_TOLERANCE = re.compile(
    r"(?P<value>\S.*?)\s+(?P<tolerance>(?:±|\+/-|\+-|[+-])?\s*\d[^\s%]*\s*(?:%|ppm\b).*)"
)
_BARE_NUMBER = re.compile(r"[+-]?[\d.]+(?:[eE][+-]?\d+)?")
_RATIO_MARK = re.compile(r"%|‰|pp[mb]\b")

_BOUND_UNITS: Mapping[BoundKind, str] = {"time": "s", "frequency": "Hz", "duty": "1", "jitter": "s"}
_LIMIT_WAYS: Mapping[BoundKind, str] = {
    "time": '"25 s 5%" or { lower = "22 s", upper = "28 s" }',
    "frequency": '"40 Hz 5%" or { lower = "38 Hz", upper = "42 Hz" }',
    "duty": '"53% .. 57%" or { lower = "53%", upper = "57%" }',
    "jitter": '{ upper = "0.2%" }, a share of the mean period, or a time',
}

Bound = tuple[float, bool]
"""A limit, and whether it is a share of the measured mean period."""


def read_value(raw: object, unit: str) -> float:
    """Return a finite value of ``unit``, from a text or a plain SI number.

    Raises:
        ValueError: If it is none; the message says what was expected.
    """
    if isinstance(raw, bool) or not isinstance(raw, str | int | float):
        raise ValueError(f"{_shown(raw)} is no value; write a text with its unit, or a number")
    _check_length(raw)
    try:
        return parse(raw, unit)
    except UnitError as error:
        raise ValueError(f"{error.message}; {error.hint}") from None
    except OverflowError:
        raise ValueError("the number is too large") from None


def read_positive(raw: object, unit: str) -> float:
    """Return a value above 0."""
    value = read_value(raw, unit)
    if value <= 0:
        raise ValueError(f"{_shown(raw)} must be greater than 0")
    return value


def read_zero_or_more(raw: object, unit: str) -> float:
    """Return a value of at least 0."""
    value = read_value(raw, unit)
    if value < 0:
        raise ValueError(f"{_shown(raw)} must not be negative")
    return value


def read_share(raw: object, example: str = '"2%"') -> float:
    """Return a share from 0 up to, not including, 1."""
    value = read_zero_or_more(raw, "1")
    if value >= 1:
        raise ValueError(f"{_shown(raw)} must be below 100 %; write a share such as {example}")
    return value


def read_coverage(raw: object) -> float:
    """Return a coverage probability between 0 and 1."""
    value = read_share(raw, '0.95 or "95%"')
    if value == 0:
        raise ValueError(f"{_shown(raw)} covers nothing; write a share such as 0.95")
    return value


def read_tolerance(raw: object) -> tuple[float, float]:
    """Return the lower and upper relative deviation of a tolerance."""
    if isinstance(raw, bool) or not isinstance(raw, str | int | float):
        raise ValueError(f'{_shown(raw)} is no tolerance; write "10%" or "-20% 50%"')
    _check_length(raw)
    try:
        lower, upper = parse_tolerance(raw)
    except UnitError as error:
        raise ValueError(f"{error.message}; {error.hint}") from None
    except OverflowError:
        raise ValueError("the number is too large") from None
    return lower, upper


def read_supply(raw: object) -> Band:
    """Return the supply in volts from "12 V 5%", "11 V .. 13 V" or "12 V"."""
    band = _ranged(raw, "V") or _toleranced(raw, "V")
    if band.lower <= 0:
        raise ValueError(f'{_shown(raw)} must be greater than 0 V, such as "12 V 5%"')
    return band


def read_temperature(raw: object) -> Band:
    """Return the temperature range in degrees Celsius from "25 degC" or "10 .. 40 degC"."""
    band = _ranged(raw, "degC") or _point(read_value(raw, "degC"))
    if band.lower < ABSOLUTE_ZERO_C:
        raise ValueError(f"{_shown(raw)} lies below absolute zero")
    return band


def read_threshold(raw: object) -> Threshold:
    """Return a switching level: "66.7%" of the supply, or "8 V".

    A bare number up to 1 could mean either and is refused.
    """
    if isinstance(raw, str) and _RATIO_MARK.search(raw):
        share = read_positive(raw, "1")
        if share >= 1:
            raise ValueError(f"{_shown(raw)} must be below 100 % of the supply")
        return Threshold(value=share, of_supply=True)
    volts = read_positive(raw, "V")
    bare = not isinstance(raw, str) or _BARE_NUMBER.fullmatch(raw.strip())
    if bare and volts <= 1:
        raise ValueError(
            f'{_shown(raw)} could be a share or volts; write "{volts * 100:g}%" for a share of '
            f'the supply, or "{volts:g} V"'
        )
    return Threshold(value=volts, of_supply=False)


def read_bound(raw: object, kind: BoundKind) -> Bound:
    """Return one limit, and whether it is a share of the mean period."""
    ratio = isinstance(raw, str) and _RATIO_MARK.search(raw) is not None
    if kind == "jitter" and ratio:
        return read_zero_or_more(raw, "1"), True
    if kind in ("time", "frequency") and ratio:
        example = 'a time such as "22 s"' if kind == "time" else 'a frequency such as "40 Hz"'
        raise ValueError(
            f"{_shown(raw)} is a share, and % is not allowed here; write {example} "
            "(only jitters and duty take a %)"
        )
    value = read_zero_or_more(raw, _BOUND_UNITS[kind])
    if kind == "duty" and value > 1:
        raise ValueError(f'{_shown(raw)} is no duty: it lies between 0 and 1, such as "55%"')
    return value, False


def tabulate_part(raw: object) -> object:
    """Turn "100k 1%" or a plain number into the table it stands for."""
    if isinstance(raw, str):
        value, tolerance = _split_tolerance(raw)
        return {"value": value} | ({} if tolerance is None else {"tolerance": tolerance})
    if isinstance(raw, bool) or not isinstance(raw, int | float | dict):
        raise ValueError(
            f'{_shown(raw)} is no part; write "100k 1%" or {{ value = "100k", tolerance = "1%" }}'
        )
    return raw if isinstance(raw, dict) else {"value": raw}


def tabulate_ic(raw: object) -> object:
    """Turn "cmos" into the table it stands for."""
    if not isinstance(raw, str | dict):
        raise ValueError(f'{_shown(raw)} is no IC; write ic = "cmos", ic = "bipolar" or a table')
    return {"family": raw} if isinstance(raw, str) else raw


def tabulate_limit(raw: object, kind: BoundKind) -> object:
    """Turn "25 s 5%" or "22 s .. 28 s" into the table it stands for."""
    if isinstance(raw, dict):
        return raw
    if isinstance(raw, str) and ".." in raw:
        lower, upper = _range_ends(raw)
        return {"lower": lower, "upper": upper}
    value, tolerance = _split_tolerance(raw) if isinstance(raw, str) else (raw, None)
    if tolerance is None or kind in ("duty", "jitter"):
        raise ValueError(f"{_shown(raw)} is no limit; write {_LIMIT_WAYS[kind]}")
    nominal = read_bound(value, kind)[0]
    lower_rel, upper_rel = read_tolerance(tolerance)
    return {"lower": nominal + nominal * lower_rel, "upper": nominal + nominal * upper_rel}


def check_limit(lower: Bound | None, upper: Bound | None) -> None:
    """Refuse a pair of limits that no value could lie between.

    Raises:
        ValueError: If both are missing, mixed in kind, or the wrong way round.
    """
    if lower is None and upper is None:
        raise ValueError("a limit needs lower or upper, or both")
    if upper and upper[0] == 0:
        raise ValueError("upper must be greater than 0")
    if not (lower and upper):
        return
    if lower[1] != upper[1]:
        raise ValueError("lower and upper must both be a share (%) or both a time")
    if lower[0] > upper[0]:
        raise ValueError(f"lower ({lower[0]:g}) lies above upper ({upper[0]:g})")


def _split_tolerance(text: str) -> tuple[str, str | None]:
    _check_length(text)
    match = _WITH_TOLERANCE.fullmatch(text.strip())
    return (match["value"], match["tolerance"]) if match else (text, None)


def _toleranced(raw: object, unit: str) -> Band:
    value, tolerance = _split_tolerance(raw) if isinstance(raw, str) else (raw, None)
    nominal = read_value(value, unit)
    if tolerance is None:
        return _point(nominal)
    if nominal <= 0:
        raise ValueError(f"{_shown(raw)} must be greater than 0")
    lower_rel, upper_rel = read_tolerance(tolerance)
    return Band(
        nominal=nominal, lower=nominal + nominal * lower_rel, upper=nominal + nominal * upper_rel
    )


def _ranged(raw: object, unit: str) -> Band | None:
    """Read "11 V .. 13 V"; its middle is the nominal value."""
    if not (isinstance(raw, str) and ".." in raw):
        return None
    lower, upper = (read_value(end, unit) for end in _range_ends(raw))
    if lower > upper:
        raise ValueError(f"{_shown(raw)} has its lower end above its upper end")
    return Band(nominal=(lower + upper) / 2, lower=lower, upper=upper)


def _range_ends(text: str) -> tuple[str, str]:
    """Split a range; in "10 .. 40 degC" the unit stands once and counts for both."""
    lower, _, upper = (end.strip() for end in text.partition(".."))
    number = _BARE_NUMBER.match(upper)
    if number and _BARE_NUMBER.fullmatch(lower) and not re.search(r"\d", upper[number.end() :]):
        lower += upper[number.end() :]
    return lower, upper


def _check_length(raw: object) -> None:
    if isinstance(raw, str) and len(raw) > _LONGEST:
        raise ValueError(f'{_shown(raw)} is too long for a value such as "100k 1%"')


def _point(value: float) -> Band:
    return Band(nominal=value, lower=value, upper=value)


def _shown(raw: object) -> str:
    """Show a value as the file has it, and never at length."""
    words = {bool: str(raw).lower(), list: "a list", dict: "a table"}
    text = words.get(type(raw)) or (repr(raw) if isinstance(raw, str) else f"{raw}")
    return text if len(text) <= 60 else text[:57] + "..."
