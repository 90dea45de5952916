"""The units benchtool speaks, as data: their spellings, prefixes and scales.

References:
    SI brochure, 9th edition (2019), table 7 (prefixes); IEC 60062:2016, clause 4 (the letter
    in place of the decimal mark); spellings without a prefix standard are common practice.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import field

from benchtool.frozen import frozen_record

PREFIX_EXPONENTS = {
    "f": -15,
    "p": -12,
    "n": -9,
    "u": -6,
    "μ": -6,  # Greek mu; the micro sign becomes this one when a text is normalised
    "m": -3,
    "": 0,
    "k": 3,
    "K": 3,
    "M": 6,
    "meg": 6,
    "Meg": 6,
    "G": 9,
    "T": 12,
}

_PREFIX_SYMBOLS = {
    -15: "f",
    -12: "p",
    -9: "n",
    -6: "µ",
    -3: "m",
    0: "",
    3: "k",
    6: "M",
    9: "G",
    12: "T",
}

_RATIOS = {"%": -2, "‰": -3, "ppm": -6, "ppb": -9}


@frozen_record
class Scale:
    """A size to print in.

    Attributes:
        exponent: Power of ten of one ``symbol`` in the SI unit.
        symbol: What is printed after the number.
        start: Power of ten from which this scale is preferred to the one below.
        power: Power of ten written after the number, where no prefix reaches so far.
    """

    exponent: int
    symbol: str
    start: int
    power: str = ""


@frozen_record
class Unit:
    """One unit: how it is written, read and scaled.

    Attributes:
        name: SI unit as benchtool's records hold it.
        noun: What it measures, for messages.
        examples: Texts that can be read, for messages.
        spellings: Words for the unit in lower case with the power of ten of each; the empty text
            stands for a bare number.
        scales: What to print in, rising.
        prefixed: Whether prefixes may stand before the spellings.
        inner: Letters that may replace the decimal mark beside the prefixes ("4R7").
        multiples: Words for multiples that are no power of ten, with their factor.
    """

    name: str
    noun: str
    examples: str
    spellings: Mapping[str, int]
    scales: tuple[Scale, ...]
    prefixed: bool = True
    inner: str = ""
    multiples: Mapping[str, int] = field(default_factory=dict)


def _words(*words: str) -> dict[str, int]:
    return dict.fromkeys(("", *words), 0)


def _prefixes(symbol: str, exponents: Iterable[int]) -> tuple[Scale, ...]:
    return tuple(
        Scale(exponent=exponent, symbol=_PREFIX_SYMBOLS[exponent] + symbol, start=exponent)
        for exponent in exponents
    )


def _shares(*ends: str) -> dict[str, int]:
    """Return the spellings of a ratio, or of one per something."""
    shares = {share + end: exponent for share, exponent in _RATIOS.items() for end in ends}
    return shares | {"": 0} | dict.fromkeys((f"1{end}" for end in ends if end), 0)


def _share_scales(end: str) -> tuple[Scale, ...]:
    return (
        Scale(exponent=-9, symbol=f"ppb{end}", start=-9),
        Scale(exponent=-6, symbol=f"ppm{end}", start=-7),
        Scale(exponent=-2, symbol=f"%{end}", start=-4),
        Scale(exponent=0, symbol=f"1{end}" if end else "", start=1),
    )


_ALL = (
    Unit(
        name="ohm",
        noun="a resistance in ohms",
        examples="330k, 4k7 or 0.47 ohm",
        spellings=_words("ω", "ohm", "ohms", "r"),
        scales=_prefixes("Ω", range(-6, 13, 3)),
        inner="RΩ",
    ),
    Unit(
        name="F",
        noun="a capacitance in farads",
        examples="47u, 100n or 2u2",
        spellings=_words("f", "farad", "farads"),
        # 2200 µF and never 2.2 mF: so capacitors are marked (common practice).
        scales=_prefixes("F", (-15, -12, -9, -6, 0)),
        inner="F",
    ),
    Unit(
        name="s",
        noun="a time in seconds",
        examples="14.01s, 2.5 ms or 310us",
        spellings=_words("s", "sec", "second", "seconds"),
        scales=_prefixes("s", range(-15, 1, 3)),
        multiples={"min": 60, "h": 3600},
    ),
    Unit(
        name="V",
        noun="a voltage in volts",
        examples="12, 12V or 37 mV",
        spellings=_words("v", "volt", "volts"),
        scales=_prefixes("V", range(-9, 4, 3)),
        inner="V",
    ),
    Unit(
        name="A",
        noun="a current in amperes",
        examples="20n, 0.1uA or 5 mA",
        spellings=_words("a", "amp", "amps", "ampere", "amperes"),
        scales=_prefixes("A", range(-15, 4, 3)),
    ),
    Unit(
        name="Hz",
        noun="a frequency in hertz",
        examples="40.4m, 1.2 kHz or 1M",
        spellings=_words("hz", "hertz"),
        scales=_prefixes("Hz", range(-6, 13, 3)),
    ),
    Unit(
        name="1",
        noun="a ratio",
        examples="5%, 50 ppm or 0.05",
        spellings=_shares(""),
        scales=_share_scales(""),
        prefixed=False,
    ),
    Unit(
        name="1/K",
        noun="a relative change per kelvin",
        examples="100 ppm/K or 0.01%/K",
        spellings=_shares("/k", "/°c", "/degc", "/c"),
        scales=_share_scales("/K"),
        prefixed=False,
    ),
    Unit(
        name="1/s",
        noun="a relative change per second",
        examples="2 ppm/s or 0.01%/s",
        spellings=_shares("/s"),
        scales=_share_scales("/s"),
        prefixed=False,
    ),
    Unit(
        name="degC",
        noun="a temperature in degrees Celsius",
        examples="25, 25 degC or -10 °C",
        spellings=_words("c", "°c", "degc"),
        scales=(Scale(exponent=0, symbol="°C", start=0),),
        prefixed=False,
    ),
)

UNITS: Mapping[str, Unit] = {unit.name: unit for unit in _ALL}
