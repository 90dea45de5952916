"""Temperature classes of ceramic capacitors, "X7R" and "C0G", and what they mean for timing.

References:
    EIA-198-1-F, tables for class 1 (coefficients) and class 2 (changes over temperature), as
    repeated in makers' general introductions; ageing figures from the same.
"""

from __future__ import annotations

import re

from benchtool.frozen import frozen_record

_LOW_C = {"X": -55, "Y": -30, "Z": 10}
_HIGH_C = {"2": 45, "4": 65, "5": 85, "6": 105, "7": 125, "8": 150, "9": 200}
_CHANGE_PCT = {
    "A": (-1.0, 1.0),
    "B": (-1.5, 1.5),
    "C": (-2.2, 2.2),
    "D": (-3.3, 3.3),
    "E": (-4.7, 4.7),
    "F": (-7.5, 7.5),
    "P": (-10.0, 10.0),
    "R": (-15.0, 15.0),
    "S": (-22.0, 22.0),
    "T": (-33.0, 22.0),
    "U": (-56.0, 22.0),
    "V": (-82.0, 22.0),
}
_PPM_FIGURE = {
    "C": 0.0,
    "B": 0.3,
    "L": 0.8,
    "A": 0.9,
    "M": 1.0,
    "P": 1.5,
    "R": 2.2,
    "S": 3.3,
    "T": 4.7,
    "V": 5.6,
    "U": 7.5,
}
_PPM_MULTIPLIER = {"0": -1, "1": -10, "2": -100, "3": -1000, "4": 1, "6": 10, "7": 100, "8": 1000}
_PPM_TOLERANCE = {"G": 30, "H": 60, "J": 120, "K": 250, "L": 500, "M": 1000, "N": 2500}
_AGEING_PCT_PER_DECADE = {
    "X7R": (1, 4),
    "X5R": (1, 4),
    "Z5U": (4, 6),
    "Y5U": (4, 6),
    "Y5V": (6, 10),
}
_OTHER_NAMES = {"NP0": "C0G", "NPO": "C0G", "COG": "C0G", "CG": "C0G"}


@frozen_record
class TemperatureClass:
    """What a temperature code says of a ceramic capacitor.

    Attributes:
        code: The code in its EIA form.
        says: Its figures in words.
        tempco_per_k: Temperature coefficient in 1/K, class 1 only.
        notes: What it means for timing, whole sentences.
    """

    code: str
    says: str
    tempco_per_k: float | None = None
    notes: tuple[str, ...] = ()


def temperature_class(code: str) -> TemperatureClass | None:
    """Return what a temperature code says, or None where it is no such code.

    Args:
        code: Such as "X7R", "C0G" or "NP0", in either case.

    Example:
        >>> temperature_class("x7r").says
        'changes by up to ±15 % between -55 and 125 °C'
    """
    upper = code.upper()
    upper = _OTHER_NAMES.get(upper, upper)
    if re.fullmatch(r"[XYZ][245-9][A-FPR-V]", upper):
        return _class_2(upper)
    if re.fullmatch(r"[CBLAMPRSTVU][0-46-8][GHJKLMN]", upper):
        return _class_1(upper)
    return None


def _class_2(code: str) -> TemperatureClass:
    lower, upper = _CHANGE_PCT[code[2]]
    change = f"±{upper:g} %" if lower == -upper else f"{lower:g} % or {upper:+g} %"
    says = f"changes by up to {change} between {_LOW_C[code[0]]} and {_HIGH_C[code[1]]} °C"
    notes = [
        "A class 2 ceramic loses capacitance under DC voltage: not for timing that must hold.",
    ]
    if code in _AGEING_PCT_PER_DECADE:
        least, most = _AGEING_PCT_PER_DECADE[code]
        notes.append(
            f"It ages: {least} to {most} % less with each tenfold of time since it was last above "
            "its Curie point (soldering resets it)."
        )
    return TemperatureClass(code=code, says=says, notes=tuple(notes))


def _class_1(code: str) -> TemperatureClass:
    ppm = _PPM_FIGURE[code[0]] * _PPM_MULTIPLIER[code[1]]
    says = (
        f"{ppm:+g} ±{_PPM_TOLERANCE[code[2]]} ppm/K"
        if ppm
        else f"0 ±{_PPM_TOLERANCE[code[2]]} ppm/K"
    )
    return TemperatureClass(
        code=code,
        says=says,
        tempco_per_k=float(f"{ppm}e-6") + 0.0,
        notes=("A class 1 ceramic does not age and keeps its value under voltage.",),
    )
