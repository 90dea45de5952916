"""What may be printed on a resistor: "4K7", "R47", "472", "4701", "68C".

References:
    IEC 60062:2016, clause 4 (letter for the decimal mark; L, R, K, M, G) and clause 5 (tolerance
    letters). Chip codes of three and four digits: common practice. EIA-96: the index is the place
    in the E96 series (IEC 60063); its multiplier letters from memory.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import replace

from benchtool.model.marking import Marking
from benchtool.parts.series import is_preferred, values
from benchtool.parts.tolerances import RESISTOR_LETTERS, resistor_tolerance

_LETTER_EXPONENT = {"L": -3, "R": 0, "K": 3, "M": 6, "G": 9, "": 0}
_TOLERANCE = rf"(?P<tolerance>[{RESISTOR_LETTERS}])?"
_INNER_LETTER = re.compile(
    r"(?:(?P<whole>\d+)(?P<letter>[LRrKkMG])(?P<part>\d*)|(?P<first>[LRKMG])(?P<rest>\d+))"
    + _TOLERANCE
)
_UNIT = re.compile(
    r"(?P<number>\d*\.?\d+)\s*(?P<letter>[kKMG]?)(?P<unit>Ω|ohms?|Ohms?|R)?" + _TOLERANCE
)
_CHIP = re.compile(r"(?P<figures>[1-9]\d{1,2})(?P<zeros>[0-7])")
_NETWORK = re.compile(r"(?P<figures>[1-9]\d)(?P<zeros>[0-6])(?P<tolerance>[FGJ])")
_EIA_96 = re.compile(r"(?P<index>\d\d)(?P<letter>[ABCDEFHSXYZ])")
_EIA_96_EXPONENT = {
    "Z": -3,
    "Y": -2,
    "X": -1,
    "S": -1,
    "A": 0,
    "B": 1,
    "H": 1,
    "C": 2,
    "D": 3,
    "E": 4,
    "F": 5,
}
_GREATEST_CHIP_OHM = 100e6
_COARSE_NOTE = "Three digits are usual at ±5 % (common practice); the code says no tolerance."
_FINE_NOTE = "Four digits are usual at ±1 % (common practice); the code says no tolerance."


def read_resistor(word: str) -> Iterator[Marking]:
    """Yield every way to read a word as a resistor's value.

    Args:
        word: One printed word.
    """
    for reader in (_inner_letter, _with_unit, _chip, _network, _eia_96, _link):
        yield from reader(word)


def _inner_letter(word: str) -> Iterator[Marking]:
    match = _INNER_LETTER.fullmatch(word)
    if not match:
        return
    letter = (match["letter"] or match["first"]).upper()
    part = match["rest"] or match["part"] or "0"
    value = f"{match['whole'] or 0}.{part}e{_LETTER_EXPONENT[letter]}"
    yield _resistor(
        word, value, f"letter {letter} in place of the decimal mark", letter=match["tolerance"]
    )


def _with_unit(word: str) -> Iterator[Marking]:
    """Read "4.7k" and "330kohm"; a bare whole number is left to the chip codes."""
    match = _UNIT.fullmatch(word)
    if not match or not (match["unit"] or (match["letter"] and "." in match["number"])):
        return
    value = f"{match['number']}e{_LETTER_EXPONENT[match['letter'].upper()]}"
    if match["unit"] != "R" or "." in match["number"]:
        yield _resistor(word, value, "value with its unit", letter=match["tolerance"])


def _chip(word: str) -> Iterator[Marking]:
    match = _CHIP.fullmatch(word)
    if not match:
        return
    figures, zeros = match["figures"], match["zeros"]
    value = f"{figures}e{zeros}"
    if float(value) > _GREATEST_CHIP_OHM:
        return
    fine = len(figures) == 3
    how = f"{'four' if fine else 'three'}-digit chip resistor: {figures} Ω × 10^{zeros}"
    yield replace(_resistor(word, value, how), notes=(_FINE_NOTE if fine else _COARSE_NOTE,))


def _network(word: str) -> Iterator[Marking]:
    match = _NETWORK.fullmatch(word)
    if match:
        value = f"{match['figures']}e{match['zeros']}"
        how = "three-digit code with a tolerance letter, as on resistor networks"
        yield _resistor(word, value, how, letter=match["tolerance"])


def _eia_96(word: str) -> Iterator[Marking]:
    match = _EIA_96.fullmatch(word)
    if not match or not 1 <= int(match["index"]) <= 96:
        return
    hundreds = round(100 * values("E96")[int(match["index"]) - 1])
    value = f"{hundreds}e{_EIA_96_EXPONENT[match['letter']]}"
    how = f"EIA-96 chip code: value {match['index']} of E96 is {hundreds}, letter {match['letter']}"
    yield replace(
        _resistor(word, value, how),
        tolerance_rel=(-0.01, 0.01),
        tolerance_from="the EIA-96 code: ±1 %",
        notes=("The multiplier letters of EIA-96 are from memory.",),
    )


def _link(word: str) -> Iterator[Marking]:
    if re.fullmatch(r"0{1,4}|0R0?", word):
        yield _resistor(word, "0", "zero-ohm link")


def _resistor(word: str, value: str, how: str, *, letter: str | None = None) -> Marking:
    value_ohm = float(value)
    tolerance = resistor_tolerance(letter) if letter else None
    return Marking(
        text=word,
        kind="resistor",
        value=value_ohm,
        unit="ohm",
        how=how,
        tolerance_rel=tolerance.sides_rel if tolerance else None,
        tolerance_from=tolerance.words if tolerance else "",
        # shunts below an ohm come in any value (common practice)
        preferred=value_ohm < 1 or is_preferred(value_ohm),
        notes=(tolerance.note,) if tolerance and tolerance.note else (),
    )
