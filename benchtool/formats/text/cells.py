"""What a cell of delimited text is, and the number in it."""

from __future__ import annotations

import math
import re
from typing import Literal

from benchtool.formats.magnitudes import in_range

Kind = Literal["N", "S", "W", "H", "L", "M", "E", "T"]
"""Number, stamp, state word, word of bits, label, mark of a missing value, empty, other text."""

_LONG_STAMP = 14  # digits of a day and a time of day run together
_EXPONENT = r"(?:[eEdD][+-]?\d+)?"
_POINT = re.compile(rf"[+-]?(?:\d+(?:\.\d*)?|\.\d+){_EXPONENT}")  # \d+\.?\d* takes n² steps
_COMMA = rf"[+-]?(?:\d+(?:,\d*)?|,\d+){_EXPONENT}"
_GROUPED_BY_COMMA = r"[+-]?[1-9]\d{0,2}(?:,\d{3})+(?:\.\d*)?"
_GROUPED_BY_POINT = r"[+-]?[1-9]\d{0,2}(?:\.\d{3})+(?:,\d*)?"
_GROUPED = r"[+-]?[1-9]\d{0,2}(?:,\d{3})+"
_BLANKS = " \u00a0\u202f'’"  # that part thousands where neither comma nor point does
_BLANK_SET = frozenset(_BLANKS)
_SPACED = rf"[+-]?\d{{1,3}}(?:[{_BLANKS}]\d{{3}})+(?:[.,]\d*)?"
_DROP_BLANKS = str.maketrans("", "", _BLANKS)
_MONTH = r"(?:[jJ]an|[fF]eb|[mM]ar|[aA]pr|[mM]ay|[jJ]u[nl]|[aA]ug|[sS]ep|[oO]ct|[nN]ov|[dD]ec)"
_BASIC = r"(?:19|20)\d{2}[01]\d[0-3]\d[T _-]?[0-2]\d[0-5]\d[0-5]\d"
_LONG_DATE = rf"{_BASIC}(?:\.\d+)?"
_DATE = r"(?:\d{4}[-/.]\d{1,2}[-/.]\d{1,2}|\d{1,2}[-/.]\d{1,2}[-/.](?:\d{4}|\d{2}))"
_DATE = rf"(?:{_DATE}|\d{{1,2}}[- ]{_MONTH}[- ]\d{{4}})"
_CLOCK = r"\d{1,4}:\d{2}(?::\d{2}(?::\d{3})?)?(?:[.,]\d+)?(?: ?[aApP][mM])?"
_ZONE = r"(?: ?Z| ?[+-]\d{2}:?\d{2}| ?UTC)?"
_STAMP = rf"\[?(?:{_DATE}(?:[T ]{_CLOCK}{_ZONE})?|{_CLOCK}{_ZONE}|{_BASIC}(?:[.,]\d+)?Z?)\]?"
_BITS = r"0[xX][0-9a-fA-F]{1,8}|0[bB][01]{1,32}|(?=.*\d)[0-9A-F]{2,8}h|[01]{2,32}b"
# Only what nearly every file needs is compiled here; the others wait for a cell that asks for them.

_RISES = frozenset({"rising", "rise", "posedge", "up", "r", "↑", "0->1", "0→1"})
_FALLS = frozenset({"falling", "fall", "negedge", "down", "f", "↓", "1->0", "1→0"})
EDGE_WORDS = _RISES | _FALLS
HIGH_WORDS = _RISES | {"1", "high", "h", "hi", "true", "on", "set"}
LOW_WORDS = _FALLS | {"0", "low", "l", "lo", "false", "off", "clear"}
UNKNOWN_WORDS = frozenset({"x", "z", "u", "unknown"})
_STATE_WORDS = (HIGH_WORDS | LOW_WORDS | UNKNOWN_WORDS) - {"0", "1"}
_MISSING = frozenset(
    {"nan", "inf", "-inf", "+inf", "infinity", "-infinity", "-", "--", "---", "----", "n/a", "na",
     "#n/a", "null", "none", "nil", "*", "**", "***", "?", "overflow", "ovr", "-nan", "+nan",
     "∞", "-∞", "+∞", "1.#inf", "-1.#inf", "1.#qnan", "-1.#ind", "#num!", "#div/0!", "missing",
     "invalid"}
)  # fmt: skip


def kind_of(cell: str, decimal: str) -> Kind:
    """Return what a cell, stripped of blanks and quotes, is."""
    if not cell:
        return "E"
    if is_number(cell, decimal):
        long = len(cell) >= _LONG_STAMP and re.fullmatch(_LONG_DATE, cell)
        return "S" if long and "." not in cell[:_LONG_STAMP] else "N"
    word = cell.lower()
    if word in _STATE_WORDS:
        return "W"
    if word in _MISSING:
        return "M"
    has_digit = any(c.isdigit() for c in cell)
    if has_digit and re.fullmatch(_STAMP, cell):
        return "S"
    return "H" if has_digit and re.fullmatch(_BITS, cell) else "T"


def is_number(cell: str, decimal: str) -> bool:
    """Say whether a cell is a number under the given decimal mark."""
    if cell[0] == "\u2212":
        cell = "-" + cell[1:]
    if not _BLANK_SET.isdisjoint(cell) and re.fullmatch(_SPACED, cell):
        cell = cell.translate(_DROP_BLANKS)
    if decimal == ".":
        grouped = "," in cell and re.fullmatch(_GROUPED_BY_COMMA, cell)
        return bool(grouped or _POINT.fullmatch(cell))
    grouped = "." in cell and re.fullmatch(_GROUPED_BY_POINT, cell)
    return bool(grouped or re.fullmatch(_COMMA, cell))


def is_grouped(cell: str) -> bool:
    """Say whether a cell reads both as ``1,234`` thousand and as a decimal fraction."""
    return bool(re.fullmatch(_GROUPED, cell)) and cell.count(",") == 1


def number(cell: str, decimal: str) -> float:
    """Return the number in a cell, NaN where there is none."""
    text = cell.strip().strip('"').strip()
    if not text or not is_number(text, decimal):
        return math.nan
    return in_range(float(plain(text, decimal)))


def plain(text: str, decimal: str) -> str:
    """Return a number as ``float`` takes it: a point, no groups, an E."""
    groups, mark = (".", ",") if decimal == "," else (",", ".")
    text = text.replace(groups, "").replace(mark, ".")
    text = text.translate(_DROP_BLANKS)
    return text.replace("\u2212", "-").replace("D", "E").replace("d", "e")


def last_digit(cell: str, decimal: str) -> int | None:
    """Return the power of ten of the last printed digit, None where there is no number."""
    text = cell.strip().strip('"').strip()
    if not text or not is_number(text, decimal):
        return None
    mantissa, _, exponent = plain(text, decimal).lower().partition("e")
    return int(exponent or 0) - len(mantissa.partition(".")[2])


def significant_digits(cell: str, decimal: str) -> int:
    """Return how many digits a number carries, leading zeros left out."""
    if not is_number(cell, decimal):
        return 0
    mantissa = plain(cell, decimal).lower().partition("e")[0]
    return len(mantissa.lstrip("+-0.").replace(".", ""))
