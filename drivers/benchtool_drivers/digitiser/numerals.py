"""Numbers as instruments print them."""

from __future__ import annotations

import math
import re

_FACTORS = {"": 1.0, "k": 1e3, "M": 1e6, "G": 1e9, "m": 1e-3, "u": 1e-6, "n": 1e-9, "p": 1e-12}
_NUMBER = re.compile(
    r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:\s?[eE]\s?[+-]?\d+)?|[+-]?(?:nan|inf(?:inity)?))"
    r"\s*(?:([kMGmunp]?)(V|s|S|Hz|HZ|Sa/s|S/s|pts))?\s*",
    re.IGNORECASE,
)
_BASES = {"h": 16, "q": 8, "b": 2}


def read_number(text: str, decimal: str = ".") -> float:
    """Return a number: 12, +1.2E-3, #HFF, #Q17, #B101, "1.5", 500us.

    Args:
        text: As the instrument answers.
        decimal: Its decimal sign.

    Raises:
        ValueError: If it is none.

    References:
        IEEE 488.2-1992, 8.7.2 to 8.7.7: NR1, NR2, NR3, hexadecimal, octal, binary.
    """
    bare = text.strip().strip('"').strip()
    if bare[:1] == "#" and bare[1:2].lower() in _BASES:
        return float(_in_base(bare))
    if decimal == ",":
        bare = bare.replace(",", ".")
    found = _NUMBER.fullmatch(bare)
    if not found:
        raise ValueError(f"{text!r} is no number")
    prefix = found[2] or ""
    factor = _FACTORS.get(prefix, _FACTORS.get(prefix.lower()))
    if factor is None:
        raise ValueError(f"{text!r} has an unknown prefix")
    return float(found[1].replace(" ", "")) * factor


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
