"""Numbers as instruments print them."""

from __future__ import annotations

import math
import re

_FACTORS = {
    "": 1.0,
    "k": 1e3,
    "M": 1e6,
    "G": 1e9,
    "m": 1e-3,
    "u": 1e-6,
    "n": 1e-9,
    "p": 1e-12,
    **dict.fromkeys(("\N{MICRO SIGN}", "\N{GREEK SMALL LETTER MU}"), 1e-6),
}
_NUMBER = re.compile(
    r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:\s?[eE]\s?[+-]?\d+)?|[+-]?(?:nan|inf(?:inity)?))"
    r"\s*(?:([kMGmunp\u00b5\u03bc]?)(Hz|S/s|Sa/s|Sps|Sa|pts?|points?|samples?|[Vs](?:/div)?)"
    r"|([kMG]))?\s*",
    re.IGNORECASE,
)
_UPPER_MILLI = re.compile("[vs](/div)?", re.IGNORECASE)
_BASES = {"h": 16, "q": 8, "b": 2}


def read_number(text: str, decimal: str = ".") -> float:
    """Return a number: 12, +1.2E-3, #HFF, #Q17, #B101, "1.5", 500us, 1.25 MSa/s, 20k.

    ``M`` before V or s is milli: an instrument that prints capitals alone means 5 ms by ``5MS``.

    Args:
        text: As the instrument answers.
        decimal: Its decimal sign.

    Raises:
        ValueError: If it is none.

    References:
        IEEE 488.2-1992, 8.7.2 to 8.7.7: NR1, NR2, NR3, hexadecimal, octal, binary; 7.7.3: M
        in a suffix is milli, but mega before HZ.
    """
    bare = text.strip().strip('"').strip()
    if bare[:1] == "#" and bare[1:2].lower() in _BASES:
        return float(_in_base(bare))
    if decimal == ",":
        bare = bare.replace(",", ".")
    found = _NUMBER.fullmatch(bare)
    if not found:
        raise ValueError(f"{text!r} is no number")
    prefix, unit = found[2] or found[4] or "", found[3] or ""
    if found[4] == "m" or (prefix == "m" and unit[:1].lower() == "p"):
        raise ValueError(f"{text!r} could be milli or mega")
    if prefix == "M" and _UPPER_MILLI.fullmatch(unit):
        prefix = "m"
    factor = _FACTORS.get(prefix, _FACTORS.get(prefix.lower()))
    if factor is None:
        raise ValueError(f"{text!r} has an unknown prefix")
    return float(found[1].replace(" ", "")) * factor


def has_unit(text: str) -> bool:
    """Say whether a number brings its own unit or prefix."""
    found = _NUMBER.fullmatch(text.strip().strip('"'))
    return found is not None and bool(found[3] or found[4])


def _in_base(text: str) -> int:
    try:
        return int(text[2:], _BASES[text[1].lower()])
    except ValueError:
        raise ValueError(f"{text!r} is no number") from None


def has_decimal_comma(text: str) -> bool:
    """Say whether a text looks like one number with a decimal comma."""
    return re.fullmatch(r"\s*[+-]?\d+,\d+(?:[eE][+-]?\d+)?\s*", text) is not None


def is_whole(value: float) -> bool:
    """Say whether a number has no fraction."""
    return math.isfinite(value) and value == int(value)
