"""Text from files and names, made harmless to show."""

from __future__ import annotations

import unicodedata

_SPELLED = {
    "±": "+/-",
    "µ": "u",
    "μ": "u",
    "Ω": "ohm",
    "·": "*",
    "×": "x",
    "…": "..",
    "–": "-",
    "≤": "<=",
    "≥": ">=",
    "√": "sqrt ",
    "∞": "inf",
    "°": "deg ",
    "²": "^2",
    "−": "-",
}


def spelled(text: str, encoding: str) -> str:
    """Return ``text`` with the characters that an encoding lacks in plain letters: "4.7 kohm"."""
    try:
        text.encode(encoding)
    except UnicodeEncodeError:
        return "".join(_spelled_char(char, encoding) for char in text)
    return text


def _spelled_char(char: str, encoding: str) -> str:
    try:
        char.encode(encoding)
    except UnicodeEncodeError:
        found = _SPELLED.get(char, char)
        return found.encode(encoding, "backslashreplace").decode(encoding)
    return char


def printable(text: str) -> str:
    """Return ``text`` with control and format characters written out, so that none acts."""
    return "".join(char if _is_harmless(char) else f"\\x{ord(char):02x}" for char in text)


def _is_harmless(char: str) -> bool:
    category = unicodedata.category(char)
    return category[0] != "C" and category not in {"Zl", "Zp"}
