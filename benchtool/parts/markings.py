"""Reading a part's whole marking: value, tolerance, class and voltage in one or several words.

A marking that can be read in several ways gives every one of them, the likeliest first: values of
an E-series come before others.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import replace

from benchtool.errors import UnitError
from benchtool.frozen import frozen_record
from benchtool.model.marking import Marking, PartKind
from benchtool.parts.bands import colour, read_bands
from benchtool.parts.capacitors import read_capacitor
from benchtool.parts.dielectrics import TemperatureClass, temperature_class
from benchtool.parts.resistors import read_resistor
from benchtool.parts.tolerances import CAPACITOR_LETTERS, capacitor_tolerance, resistor_tolerance
from benchtool.units import parse_tolerance

_VOLTS = re.compile(r"(?P<volts>\d+(?:\.\d+)?)(?P<kilo>k)?(?:V|WV)(?:DC|AC|dc|ac)?")
_UNIT_WORD = re.compile(r"[kKMG]?(?:Ω|ohms?|Ohms?|R)|[pnuμm]F|F|mfd|MFD")
# "100V" alone is a voltage; "103V" is the letter V for the tolerance
_VOLTS_ALONE = {f"{volts}V" for volts in (10, 16, 25, 35, 50, 63, 100, 160, 200, 250, 400, 630)}
_SHARE = re.compile(r"[±+\-\d./ ]*\d\s*%")


@frozen_record
class _Extras:
    """What stands beside the value."""

    tolerance: str = ""
    volts: float | None = None
    temperature: TemperatureClass | None = None


def decode(text: str, *, kind: PartKind | None = None) -> tuple[Marking, ...]:
    """Return every way to read one part's marking, the likeliest first.

    Args:
        text: What is printed ("472 X7R 50V"), or the colours of the bands.
        kind: ``capacitor`` or ``resistor`` where that is known.

    Raises:
        UnitError: If the marking, or a word of it, cannot be read.

    Example:
        >>> [(item.kind, item.value) for item in decode("472")]
        [('capacitor', 4.7e-09), ('resistor', 4700.0)]
    """
    words = _glued(_plain(text).split())
    colours = [colour(word) for word in words]
    readings = (
        read_bands([name for name in colours if name])
        if words and all(colours)
        else tuple(_read_words(text, words))
    )
    wanted = [item for item in readings if kind in {None, item.kind}]
    if not wanted:
        raise _unreadable(text, words, kind)
    likely_first = sorted(_distinct(wanted), key=lambda item: not item.preferred)
    return tuple(_with_doubt(replace(item, text=text)) for item in likely_first)


def split_markings(texts: Sequence[str]) -> tuple[str, ...]:
    """Return one text a part from the words of a command line.

    Colours in a row are one part; a voltage, a tolerance, a temperature class or a unit belongs to
    the word before it; a text with spaces is a part of its own.

    Example:
        >>> split_markings(["103", "50V", "yellow", "violet", "red", "gold", "4n7K"])
        ('103 50V', 'yellow violet red gold', '4n7K')
    """
    parts: list[list[str]] = []
    for text in texts:
        if parts and _belongs_to(text, parts[-1]):
            parts[-1].append(text)
        else:
            parts.append([text])
        if len(parts) > 1 and _is_volts_beside(parts[-1], parts[-2]):  # "25" "V"
            parts[-2].extend(parts.pop())
    return tuple(" ".join(part) for part in parts)


def _is_volts_beside(part: list[str], before: list[str]) -> bool:
    return bool(_VOLTS.fullmatch("".join(part))) and not colour(before[-1])


def _belongs_to(text: str, part: list[str]) -> bool:
    if " " in text or any(" " in word for word in part):
        return False
    before, word = colour(part[-1]), _plain(text)
    if before or colour(word):
        return bool(before and colour(word))
    return bool(_UNIT_WORD.fullmatch(word)) or _extra(word) is not None


def _plain(text: str) -> str:
    unified = unicodedata.normalize("NFKC", text).replace("\N{MINUS SIGN}", "-")
    return re.sub(r"(?<=[A-Za-z])/|/(?=[A-Za-z])", " ", unified)  # "47uF/25V", not "47/25"


def _glued(words: list[str]) -> list[str]:
    """Join a number and the unit or percent sign that was written apart from it."""
    glued: list[str] = []
    for word in words:
        number_before = glued and re.fullmatch(r"[±+-]?\d*\.?\d+", glued[-1])
        if number_before and (_UNIT_WORD.fullmatch(word) or word in {"%", "V"}):
            glued[-1] += word
        else:
            glued.append(word)
    return glued


def _read_words(text: str, words: list[str]) -> Iterator[Marking]:
    extras = [_extra(word) for word in words]
    plain_words = [word for word, extra in zip(words, extras, strict=True) if extra is None]
    if len(plain_words) > 1:
        raise _unreadable(text, plain_words[1:] if _reads(plain_words[0]) else plain_words, None)
    if plain_words:
        yield from _read_value(plain_words[0], [extra for extra in extras if extra])
        return
    for at, word in enumerate(words):  # "M7G 5%": a class by its look, a value by its place
        if _reads(word) and word not in _VOLTS_ALONE:
            rest = [extra for other, extra in enumerate(extras) if extra and other != at]
            yield from _read_value(word, rest)
            break
    if len(words) == 1 and extras[0] and extras[0].temperature:
        yield _class_alone(extras[0].temperature)


def _extra(word: str) -> _Extras | None:
    volts = _VOLTS.fullmatch(word)
    if volts:
        return _Extras(volts=float(volts["volts"]) * (1000 if volts["kilo"] else 1))
    if _SHARE.fullmatch(word) or (len(word) == 1 and word in CAPACITOR_LETTERS):
        return _Extras(tolerance=word)
    temperature = temperature_class(word)
    return _Extras(temperature=temperature) if temperature else None


def _reads(word: str) -> bool:
    return any(True for _ in (*read_capacitor(word), *read_resistor(word)))


def _read_value(word: str, extras: list[_Extras]) -> Iterator[Marking]:
    volts = next((extra.volts for extra in extras if extra.volts is not None), None)
    temperature = next((extra.temperature for extra in extras if extra.temperature), None)
    tolerance = next((extra.tolerance for extra in extras if extra.tolerance), "")
    readings = list(read_capacitor(word, beside_volts=volts is not None))
    if volts is None and temperature is None:  # both are printed on capacitors alone
        resistors = list(read_resistor(word))
        first = bool(re.fullmatch(r"\d{1,2}[KM]", word))  # "47K" is seldom 47 pF ±10 %
        readings = resistors + readings if first else readings + resistors
    for reading in readings:
        if reading.tolerance_rel and reading.tolerance_rel[0] <= -1:  # "1F": not 1 pF ±1 pF
            continue
        marked = _with_tolerance(reading, tolerance) if tolerance else reading
        rated = volts if volts is not None else marked.rated_voltage_v
        yield _with_class(replace(marked, rated_voltage_v=rated), temperature)


def _with_tolerance(reading: Marking, mark: str) -> Marking:
    if "%" in mark:
        return replace(reading, tolerance_rel=parse_tolerance(mark), tolerance_from=mark)
    tolerance = (
        capacitor_tolerance(mark, reading.value or 0.0)
        if reading.kind == "capacitor"
        else resistor_tolerance(mark)
    )
    if tolerance is None:
        return reading
    notes = (*reading.notes, tolerance.note) if tolerance.note else reading.notes
    return replace(
        reading, tolerance_rel=tolerance.sides_rel, tolerance_from=tolerance.words, notes=notes
    )


def _with_class(reading: Marking, temperature: TemperatureClass | None) -> Marking:
    if temperature is None:
        return reading
    return replace(
        reading,
        temperature_code=temperature.code,
        temperature_note=temperature.says,
        tempco_per_k=temperature.tempco_per_k,
        notes=(*reading.notes, *temperature.notes),
    )


def _class_alone(temperature: TemperatureClass) -> Marking:
    blank = Marking(
        text="", kind="capacitor", value=None, unit="F", how="temperature class of a ceramic"
    )
    return _with_class(blank, temperature)


def _with_doubt(reading: Marking) -> Marking:
    if reading.preferred:
        return reading
    doubt = "The value is in no E-series that parts marked so come in: look at the print again."
    return replace(reading, notes=(*reading.notes, doubt))


def _distinct(readings: Iterable[Marking]) -> list[Marking]:
    """Leave out readings that give the same part by another road."""
    seen: dict[tuple[object, ...], Marking] = {}
    for item in readings:
        seen.setdefault((item.kind, item.value, item.tolerance_rel, item.rated_voltage_v), item)
    return list(seen.values())


def _unreadable(text: str, words: Sequence[str], kind: PartKind | None) -> UnitError:
    strange = [word for word in words if not (_reads(word) or _extra(word) or colour(word))]
    what = f"{strange[0]!r} in {text!r}" if strange and strange[0] != text.strip() else repr(text)
    return UnitError(
        f"cannot read {what} as {f'the marking of a {kind}' if kind else 'a part marking'}",
        hint='give what is printed, such as 104K, 4n7, 4K7 or "47uF 25V", or the bands, such as '
        '"yellow violet red gold"',
    )
