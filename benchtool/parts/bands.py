"""Colour bands of resistors, three to six of them.

References:
    IEC 60062:2016, clause 3 (digits and multipliers; pink and the tolerances of orange, yellow and
    grey as in the 2016 edition, from memory; temperature coefficients from memory).
    Two-letter colour codes: IEC 60757, from memory.
"""

from __future__ import annotations

from collections.abc import Sequence

from benchtool.model.marking import Marking
from benchtool.parts.series import is_preferred

_DIGIT = {
    "black": 0,
    "brown": 1,
    "red": 2,
    "orange": 3,
    "yellow": 4,
    "green": 5,
    "blue": 6,
    "violet": 7,
    "grey": 8,
    "white": 9,
}
_EXPONENT = _DIGIT | {"gold": -1, "silver": -2, "pink": -3}
_TOLERANCE_PCT = {
    "brown": 1.0,
    "red": 2.0,
    "orange": 0.05,
    "yellow": 0.02,
    "green": 0.5,
    "blue": 0.25,
    "violet": 0.1,
    "grey": 0.01,
    "gold": 5.0,
    "silver": 10.0,
}
_TEMPCO_PPM = {
    "black": 250,
    "brown": 100,
    "red": 50,
    "orange": 15,
    "yellow": 25,
    "green": 20,
    "blue": 10,
    "violet": 5,
    "grey": 1,
}
_NO_BAND_PCT = 20.0
_OTHER_NAMES = {
    "bk": "black",
    "bn": "brown",
    "rd": "red",
    "og": "orange",
    "ye": "yellow",
    "gn": "green",
    "bu": "blue",
    "vt": "violet",
    "purple": "violet",
    "gy": "grey",
    "gray": "grey",
    "wh": "white",
    "pk": "pink",
    "gd": "gold",
    "sr": "silver",
}


def colour(word: str) -> str | None:
    """Return the colour that a word names, or None where it names none."""
    lower = word.lower()
    lower = _OTHER_NAMES.get(lower, lower)
    return lower if lower in _EXPONENT else None


def read_bands(colours: Sequence[str]) -> tuple[Marking, ...]:
    """Return every way to read a row of bands, from either end.

    Args:
        colours: Three to six colours, or one black band; each as ``colour`` returns it.

    Returns:
        Readings whose value is of an E-series, or all where none is; empty where none exists.
    """
    text = " ".join(colours)
    if list(colours) == ["black"]:
        return (_link(text),)
    ends = [colours] if list(colours) == list(reversed(colours)) else [colours, colours[::-1]]
    readings = [
        reading
        for order, bands in enumerate(ends)
        if (reading := _read(text, bands, reversed_order=order == 1))
    ]
    return tuple(item for item in readings if item.preferred) or tuple(readings)


def _read(text: str, bands: Sequence[str], *, reversed_order: bool) -> Marking | None:
    n_figures = 2 if len(bands) <= 4 else 3
    figures = [_DIGIT.get(band) for band in bands[:n_figures]]
    if not 3 <= len(bands) <= 6 or None in figures or figures[0] == 0:
        return None
    tolerance = _tolerance(bands, n_figures)
    tempco_ppm = _TEMPCO_PPM.get(bands[5]) if len(bands) == 6 else None
    if tolerance is None or (len(bands) == 6 and tempco_ppm is None):
        return None
    number = "".join(str(figure) for figure in figures)
    exponent = _EXPONENT[bands[n_figures]]
    value_ohm = float(f"{number}e{exponent}")
    share, words = tolerance
    how = f"{len(bands)} bands: {number} Ω × 10^{exponent}"
    return Marking(
        text=text,
        kind="resistor",
        value=value_ohm,
        unit="ohm",
        how=f"{how}, read from the other end" if reversed_order else how,
        tolerance_rel=(-share, share),
        tolerance_from=words,
        tempco_per_k=tempco_ppm / 1e6 if tempco_ppm is not None else None,
        preferred=is_preferred(value_ohm, "E24" if n_figures == 2 else None),
        notes=_notes(bands[n_figures + 1 :]),
    )


def _tolerance(bands: Sequence[str], n_figures: int) -> tuple[float, str] | None:
    if len(bands) == 3:
        return _NO_BAND_PCT / 100, f"no fourth band: ±{_NO_BAND_PCT:g} %"
    band = bands[n_figures + 1]
    percent = _TOLERANCE_PCT.get(band)
    return None if percent is None else (percent / 100, f"{band} band: ±{percent:g} %")


def _notes(after_value: Sequence[str]) -> tuple[str, ...]:
    if after_value and after_value[0] in {"orange", "yellow", "grey"}:
        return (
            f"A {after_value[0]} tolerance band is read as in the 2016 edition, which changed it.",
        )
    return ()


def _link(text: str) -> Marking:
    return Marking(text=text, kind="resistor", value=0.0, unit="ohm", how="one black band: link")
