"""What may be printed on a capacitor: "104K", "4n7", "p33", ".047K100", "47/25".

References:
    IEC 60062:2016, clause 4 (letter for the decimal mark; p, n, µ, m, F) and clause 5 (tolerance
    letters). Three-digit codes in picofarads, with 8 and 9 for 0.01 and 0.1: EIA; 8 and 9 from
    memory. Bare decimals in microfarads and microfarads/volts: common practice.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import replace

from benchtool.model.marking import Marking
from benchtool.parts.series import is_preferred
from benchtool.parts.tolerances import CAPACITOR_LETTERS, capacitor_tolerance, voltage_code

_LETTER_EXPONENT = {"p": -12, "n": -9, "u": -6, "μ": -6, "m": -3, "F": 0, "mfd": -6}
_WHOLE_PICOFARADS = {float(f"{picofarads}e-12") for picofarads in range(1, 10)}  # common practice
_CODE_EXPONENT = {str(digit): digit for digit in range(8)} | {"8": -2, "9": -1}
_TOLERANCE = rf"(?P<tolerance>[{CAPACITOR_LETTERS}])?"

_CODE = re.compile(
    r"(?P<volts>[0-3][A-HJKVW]|[GJACDEVT])?(?P<figures>[1-9]\d)(?P<zeros>\d)" + _TOLERANCE
)
_WITH_VOLTS = re.compile(r"(\d{3}|0?\.\d+)([FGJKM])(\d{2,4})")
_INNER_LETTER = re.compile(
    r"(?P<whole>\d*)(?P<letter>[pnuμm]|(?<=\d)[PNUF])(?P<part>\d+)F?" + _TOLERANCE
)
_UNIT = re.compile(r"(?P<number>\d*\.?\d+)(?P<letter>mfd|MFD|[pnuμm]F?)" + _TOLERANCE)
_PLAIN = re.compile(r"(?P<number>[1-9]\d?|[1-9]\d{0,2}0|\d*\.\d+)" + _TOLERANCE)
_ELECTROLYTIC = re.compile(r"(\d+(?:\.\d+)?)/(\d+(?:\.\d+)?)")


def read_capacitor(word: str, *, beside_volts: bool = False) -> Iterator[Marking]:
    """Yield every way to read a word as a capacitor's value.

    Args:
        word: One printed word, micro signs unified to the Greek letter.
        beside_volts: Whether a voltage stands beside it, as on electrolytics.
    """
    for reader in (_code, _with_volts, _inner_letter, _with_unit, _electrolytic, _plain, _farads):
        yield from reader(word)
    if beside_volts:
        yield from _microfarads_beside_volts(word)


def _code(word: str) -> Iterator[Marking]:
    match = _CODE.fullmatch(word)
    if not match:
        return
    figures, exponent = match["figures"], _CODE_EXPONENT[match["zeros"]]
    marking = _capacitor(
        word,
        f"{figures}e{exponent - 12}",
        f"three-digit code: {figures} pF × 10^{exponent}",
        letter=match["tolerance"],
    )
    code = match["volts"]
    if code:
        notes = (*marking.notes, f"The voltage code {code} is from memory.")
        marking = replace(marking, rated_voltage_v=voltage_code(code), notes=notes)
    yield marking


def _with_volts(word: str) -> Iterator[Marking]:
    match = _WITH_VOLTS.fullmatch(word)
    if not match:
        return
    number, letter, volts = match.groups()
    if "." in number:
        value, how = f"{number}e-6", "bare decimal in microfarads, then tolerance and volts"
    else:
        value = f"{number[:2]}e{_CODE_EXPONENT[number[2]] - 12}"
        how = "three-digit code in picofarads, then tolerance and volts"
    yield replace(_capacitor(word, value, how, letter=letter), rated_voltage_v=float(volts))


def _inner_letter(word: str) -> Iterator[Marking]:
    match = _INNER_LETTER.fullmatch(word)
    if match:
        letter = match["letter"] if match["letter"] == "F" else match["letter"].lower()
        value = f"{match['whole'] or 0}.{match['part']}e{_LETTER_EXPONENT[letter]}"
        how = f"letter {match['letter']} in place of the decimal mark"
        yield _capacitor(word, value, how, letter=match["tolerance"])
        if match["tolerance"] is None and word.endswith("F"):  # "4n7F": farads, or ±1 %
            yield _capacitor(word, value, how, letter="F")


def _with_unit(word: str) -> Iterator[Marking]:
    match = _UNIT.fullmatch(word)
    if match:
        letter = match["letter"].lower().removesuffix("f")
        value = f"{match['number']}e{_LETTER_EXPONENT[letter]}"
        how = f"value with its prefix {match['letter']}"
        yield _capacitor(word, value, how, letter=match["tolerance"])


def _farads(word: str) -> Iterator[Marking]:
    match = re.fullmatch(r"(\d*\.?\d+)F", word)
    if match:
        yield _capacitor(word, match[1], "whole farads, as on double-layer capacitors")


def _electrolytic(word: str) -> Iterator[Marking]:
    match = _ELECTROLYTIC.fullmatch(word)
    if match:
        how = "electrolytic print: microfarads / volts"
        yield replace(_capacitor(word, f"{match[1]}e-6", how), rated_voltage_v=float(match[2]))


def _plain(word: str) -> Iterator[Marking]:
    match = _PLAIN.fullmatch(word)
    if not match:
        return
    number, letter = match["number"], match["tolerance"]
    whole = "." not in number
    if whole and len(number) > 2 and not is_preferred(float(number), "E24"):
        return
    if whole or float(number) >= 1:
        how = "plain number in picofarads, as on small ceramics"
        yield _capacitor(word, f"{number}e-12", how, letter=letter)
    if not whole:
        how = "bare decimal in microfarads, as on film capacitors"
        yield _capacitor(word, f"{number}e-6", how, letter=letter)


def _microfarads_beside_volts(word: str) -> Iterator[Marking]:
    if re.fullmatch(r"\d{1,5}", word) and is_preferred(float(word), "E12"):
        how = "electrolytic print: microfarads beside volts"
        yield _capacitor(word, f"{word}e-6", how)


def _capacitor(word: str, value: str, how: str, *, letter: str | None = None) -> Marking:
    value_f = float(value)
    tolerance = capacitor_tolerance(letter, value_f) if letter else None
    return Marking(
        text=word,
        kind="capacitor",
        value=value_f,
        unit="F",
        how=how,
        tolerance_rel=tolerance.sides_rel if tolerance else None,
        tolerance_from=tolerance.words if tolerance else "",
        preferred=is_preferred(value_f, "E24") or value_f in _WHOLE_PICOFARADS,
        notes=(tolerance.note,) if tolerance and tolerance.note else (),
    )
