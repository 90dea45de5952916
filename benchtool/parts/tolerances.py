"""Tolerance letters and voltage codes.

References:
    IEC 60062:2016, clause 5 (tolerance letters; those below 0.1 % from memory); EIA lists for the
    capacitor letters and for the absolute tolerances below 10 pF (F and G there from memory).
    Voltage codes: from memory (they follow the R10 values, the digit is the power of ten).
"""

from __future__ import annotations

from benchtool.frozen import frozen_record

SYMMETRIC_PCT = {
    "B": 0.1,
    "C": 0.25,
    "D": 0.5,
    "F": 1.0,
    "G": 2.0,
    "H": 3.0,
    "J": 5.0,
    "K": 10.0,
    "M": 20.0,
    "N": 30.0,
}
_TIGHT_PCT = {"L": 0.01, "P": 0.02, "W": 0.05}
_ASYMMETRIC_PCT = {
    "Q": (-10.0, 30.0),
    "R": (-20.0, 30.0),
    "S": (-20.0, 50.0),
    "T": (-10.0, 50.0),
    "V": (-10.0, 100.0),
    "Y": (0.0, 50.0),
    "Z": (-20.0, 80.0),
}
_ABSOLUTE_PF = {"B": 0.1, "C": 0.25, "D": 0.5, "F": 1.0, "G": 2.0}
_ABSOLUTE_BELOW_F = 10e-12
_E_NOTE = (
    "The letter E is ±0.5 % in lists of capacitors (EIA) and ±0.005 % in IEC 60062: without the "
    "maker's sheet it cannot be told, so no tolerance is given."
)

CAPACITOR_LETTERS = "BCDEFGHJKMNLPWQRSTVYZ"
RESISTOR_LETTERS = "BCDEFGHJKMNLPW"

_R10 = {
    "A": 1.0,
    "B": 1.25,
    "C": 1.6,
    "D": 2.0,
    "E": 2.5,
    "F": 3.15,
    "G": 4.0,
    "H": 5.0,
    "J": 6.3,
    "K": 8.0,
    "V": 3.5,
    "W": 4.5,
}
_CHIP_TANTALUM_V = {
    "e": 2.5,
    "G": 4.0,
    "J": 6.3,
    "A": 10.0,
    "C": 16.0,
    "D": 20.0,
    "E": 25.0,
    "V": 35.0,
    "T": 50.0,
}


@frozen_record
class Tolerance:
    """What a tolerance letter says of a value.

    Attributes:
        sides_rel: Lower and upper relative tolerance; None where the letter does not settle it.
        words: Where it comes from and its figures.
        note: What to know of it, a whole sentence, or empty.
    """

    sides_rel: tuple[float, float] | None
    words: str
    note: str = ""


def capacitor_tolerance(letter: str, value_f: float) -> Tolerance | None:
    """Return what a letter says of a capacitor; below 10 pF some letters are picofarads.

    Args:
        letter: One capital letter.
        value_f: Its capacitance in farads.

    Returns:
        None where the letter is no tolerance of capacitors.
    """
    if letter in _ABSOLUTE_PF and 0 < value_f < _ABSOLUTE_BELOW_F:
        picofarads = _ABSOLUTE_PF[letter]
        share = picofarads * 1e-12 / value_f
        return Tolerance(
            sides_rel=(-share, share),
            words=f"{letter}: ±{picofarads:g} pF",
            note=f"Below 10 pF the letter {letter} is an absolute tolerance in picofarads.",
        )
    if letter in _ASYMMETRIC_PCT:
        lower, upper = _ASYMMETRIC_PCT[letter]
        words = f"{letter}: {lower:g} % to {upper:+g} %"
        return Tolerance(sides_rel=(lower / 100, upper / 100), words=words)
    return resistor_tolerance(letter)


def resistor_tolerance(letter: str) -> Tolerance | None:
    """Return what a letter says of a resistor, or None where it is no tolerance of resistors."""
    if letter == "E":
        return Tolerance(sides_rel=None, words="E: not settled", note=_E_NOTE)
    percent = SYMMETRIC_PCT.get(letter, _TIGHT_PCT.get(letter))
    if percent is None:
        return None
    share = percent / 100
    return Tolerance(sides_rel=(-share, share), words=f"{letter}: ±{percent:g} %")


def voltage_code(code: str) -> float | None:
    """Return the volts of "1H" (50 V), or of the one letter on a tantalum chip; None otherwise.

    References:
        From memory: EIA/JIS voltage codes, power-of-ten digit then a letter of the R10 series.
    """
    if len(code) == 1:
        return _CHIP_TANTALUM_V.get(code)
    figure = _R10.get(code[1:])
    if figure is None or not "0" <= code[0] <= "3":
        return None
    return float(f"{figure}e{code[0]}")
