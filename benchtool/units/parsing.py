"""Reading values as people write them: "4k7", "100n", "0.1 µF", "5%", "14.01s"."""

from __future__ import annotations

import math
import re
from numbers import Real

from benchtool.errors import UnitError
from benchtool.units.symbols import PREFIX_EXPONENTS, UNITS, Unit

# Compiled where they are used: the room is loaded to show figures more often than to read them.
# Groups of three digits may be parted by a (thin) space: SI brochure, 9th edition, 5.4.4.
_NUMBER = (
    r"(?P<number>[+-]?(?:(?:\d{1,3}(?: \d{3})+(?!\d)|\d+)(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d+)?)"
    r"\s*(?P<suffix>.*)"
)
_INNER = r"(?P<sign>[+-]?)(?P<whole>\d*)(?P<mark>meg|Meg|\D)(?P<part>\d+)\s*(?P<suffix>\D*)"
_BOTH_SIDES = r"(?:±|\+/-|\+-)\s*(.+)"
_SIDE = r"([+-]?[\d.]+(?:[eE][+-]?\d+)?\s*[^\d.\s/+-]*)"
_TWO_SIDES = rf"{_SIDE}\s*(?:/|\.\.|\bto\b|\s|(?<![eE])(?=[+-]))\s*{_SIDE}"
_SHARE = r"(?:%|‰|pp[mb])$"


def parse(text: str | float, unit: str) -> float:
    """Return the value of a text in the SI unit asked for.

    SI letters mean what SI says: ``m`` is milli and ``M`` is mega, everywhere. A comma is never
    guessed at.

    Args:
        text: The value; a number passes through and is taken to be in ``unit``.
        unit: ohm, F, s, V, A, Hz, 1, 1/K, 1/s or degC.

    Raises:
        UnitError: If the text is no value of that unit, or is not finite.

    References:
        IEC 60062:2016, clause 4 (a letter in place of the decimal mark).

    Example:
        >>> parse("4k7", "ohm"), parse("0.1uF", "F"), parse("5%", "1")
        (4700.0, 1e-07, 0.05)
    """
    kind = UNITS[unit]
    if not isinstance(text, str):
        return _checked_number(text, kind)
    plain = _plain(text)
    if "," in plain:
        raise _comma_error(text, plain, kind)
    value = _read_inner(plain, kind)
    if value is None:
        value = _read_number(plain, kind)
    if value is None:
        raise UnitError(
            f"{text!r} is not {kind.noun}{_seen_as(plain, kind)}",
            hint=f"write it like {kind.examples}",
        )
    return _finite(value, text, kind)


def parse_tolerance(text: str | float) -> tuple[float, float]:
    """Return the lower and upper relative tolerance.

    Args:
        text: "5%", "±5 %", "-20% 50%", "-20/+50 %", or a relative number below 1.

    Returns:
        Lower (zero or below, above -1) and upper (zero or above).

    Raises:
        UnitError: If the text is no tolerance, or its two sides do not enclose the value.

    Example:
        >>> parse_tolerance("-20% 50%")
        (-0.2, 0.5)
    """
    sides = _tolerance_sides(_plain(text)) if isinstance(text, str) else (text, text)
    one_sided = len(sides) == 1 or not isinstance(text, str)
    lower, upper = (parse(side, "1") for side in (sides[0], sides[-1]))
    if one_sided:
        lower = -upper
    if not -1 < lower <= 0 <= upper:
        raise _tolerance_error(text)
    if isinstance(text, str) and upper >= 1 and "%" not in text:
        raise _tolerance_error(text)
    return lower + 0.0, upper + 0.0


def _tolerance_sides(plain: str) -> tuple[str, ...]:
    both = re.fullmatch(_BOTH_SIDES, plain)
    if both:
        return (both[1],)
    two = re.fullmatch(_TWO_SIDES, plain)
    if not two:
        return (plain,)
    lower, upper = two[1], two[2]
    share = re.search(_SHARE, upper)
    if share and not re.search(_SHARE, lower.strip()):  # "-20/+50 %": the sign stands once for both
        lower += share[0]
    return lower, upper


def _tolerance_error(text: str | float) -> UnitError:
    return UnitError(
        f"{text!r} is not a tolerance: it must enclose the value and end above -100 %",
        hint='write it like 5%, or "-20% 50%" where the two sides differ',
    )


def _plain(text: str) -> str:
    """Unify micro signs, ohm signs, minus signs and spaces."""
    import unicodedata

    unified = unicodedata.normalize("NFKC", text).replace("\N{MINUS SIGN}", "-")
    return " ".join(unified.split())


def _checked_number(number: object, kind: Unit) -> float:
    if isinstance(number, bool) or not isinstance(number, Real):
        raise UnitError(
            f"{number!r} is not {kind.noun}", hint=f"give a number or a text like {kind.examples}"
        )
    return _finite(float(number), number, kind)


def _finite(value: float, given: object, kind: Unit) -> float:
    if not math.isfinite(value):
        raise UnitError(
            f"{given!r} is not a finite value", hint=f"give {kind.noun}, like {kind.examples}"
        )
    return value


def _read_inner(plain: str, kind: Unit) -> float | None:
    """Read "4k7": the letter stands in place of the decimal mark."""
    match = re.fullmatch(_INNER, plain)
    if not (match and kind.prefixed):
        return None
    mark, suffix = match["mark"], match["suffix"]
    known = PREFIX_EXPONENTS.get(mark, 0 if mark.upper() in kind.inner else None)
    if known is None or suffix.lower() not in kind.spellings:
        return None
    return float(f"{match['sign']}{match['whole'] or 0}.{match['part']}e{known}")


def _read_number(plain: str, kind: Unit) -> float | None:
    """Read "0.1 uF": a number, then a prefix and a unit, either of which may be missing."""
    match = re.fullmatch(_NUMBER, plain)
    if not match:
        return None
    number = match["number"].replace(" ", "")
    factor = kind.multiples.get(match["suffix"])
    if factor is not None:
        return float(number) * factor
    exponent = _suffix_exponent(match["suffix"], kind)
    return None if exponent is None else _shifted(number, exponent)


def _suffix_exponent(suffix: str, kind: Unit) -> int | None:
    if kind.prefixed:
        for prefix, exponent in PREFIX_EXPONENTS.items():
            word = suffix[len(prefix) :].strip().lower()
            if prefix and suffix.startswith(prefix) and word in kind.spellings:
                return exponent
    return kind.spellings.get(suffix.lower())


def _shifted(number: str, exponent: int) -> float:
    """Move the decimal mark in the text, so that 0.1 µF is exactly the float nearest 1e-7."""
    mantissa, _, power = number.lower().partition("e")
    return float(f"{mantissa}e{int(power or 0) + exponent}")


def _seen_as(plain: str, kind: Unit) -> str:
    """Say what the text would be, where it is a value of another unit."""
    if not plain or plain[-1].isdigit():
        return ""
    for other in UNITS.values():
        if other is not kind and _read_number(plain, other) is not None:
            return f"; it reads as {other.noun}"
    return ""


def _comma_error(text: str, plain: str, kind: Unit) -> UnitError:
    ways = [
        way
        for way in (plain.replace(",", "."), plain.replace(",", ""))
        if (_read_inner(way, kind), _read_number(way, kind)) != (None, None)
    ]
    return UnitError(
        f"{text!r} has a comma, which could be a decimal mark or part thousands",
        hint=f"write {' or '.join(ways) or f'it like {kind.examples}'}",
    )
