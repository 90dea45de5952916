"""Figures as people read them, with engineering prefixes and no false digits."""

from __future__ import annotations

import math
from collections.abc import Iterable
from decimal import Context, Decimal

from benchtool.units.symbols import UNITS, Scale

_EXACT = Context(prec=60)
_MOST_DIGITS = 15  # what a float holds
_ZERO_EXPONENTS = {"1": -2, "1/K": -6, "1/s": -6}  # nothing is 0 %, 0 ppm/K


def format_value(value: float, unit: str, digits: int = 4) -> str:
    """Return a value with an engineering prefix, trailing zeros left out.

    Ratios are shown in %, below 0.01 % in ppm, below 0.1 ppm in ppb, from 10 up as a plain number.
    Farads skip milli: 2200 µF. Times from 1 s up stay in seconds.

    Args:
        value: In the SI unit ``unit``; NaN gives "no value".
        unit: ohm, F, s, V, A, Hz, 1, 1/K, 1/s or degC.
        digits: Significant digits, 1 to 15.

    Example:
        >>> format_value(4700, "ohm"), format_value(47e-6, "F"), format_value(0.004, "1")
        ('4.7 kΩ', '47 µF', '0.4 %')
    """
    if not math.isfinite(value):
        return _not_finite(value, unit)
    rounded = _significant(Decimal(repr(float(value))), digits)
    scale = _scale((rounded,), unit)
    number = f"{_in_scale(rounded, scale):f}"
    if "." in number:
        number = number.rstrip("0").rstrip(".")
    return _joined(_without_minus_zero(number), scale)


def format_measured(value: float, U: float, unit: str) -> str:
    """Return "value ± U", both with the prefix and the last digit that U calls for.

    Args:
        value: The estimate, in ``unit``.
        U: Expanded uncertainty, in ``unit``, zero or more; NaN or infinite where it is not known.
        unit: ohm, F, s, V, A, Hz, 1, 1/K, 1/s or degC.

    Raises:
        ValueError: If ``U`` is negative.

    References:
        JCGM 100:2008, 7.2.6: two significant digits of U at most, the estimate rounded to match.

    Example:
        >>> format_measured(0.00102041, 3.14e-6, "s")
        '1.0204 ms ± 0.0031 ms'
    """
    if U < 0:
        raise ValueError(f"an expanded uncertainty is zero or more, got {U}")
    if not math.isfinite(value):
        return _not_finite(value, unit)
    if not math.isfinite(U):
        return f"{format_value(value, unit)} (uncertainty not known)"
    if abs(value) * 10.0**-_MOST_DIGITS > U:  # nothing to round to: U is zero, or below a float
        return f"{format_value(value, unit, _MOST_DIGITS)} ± {format_value(U, unit, 2)}"
    return _pair(Decimal(repr(float(value))), _significant(Decimal(repr(float(U))), 2), unit)


def _pair(value: Decimal, U: Decimal, unit: str) -> str:
    rounded = value.quantize(U, context=_EXACT)
    scale = _scale((rounded, U), unit)
    numbers = (f"{_in_scale(item, scale):f}" for item in (rounded, U))
    return " ± ".join(_joined(_without_minus_zero(number), scale) for number in numbers)


def _significant(value: Decimal, digits: int) -> Decimal:
    """Round to a number of significant digits, keeping the zeros that are significant."""
    if not value:
        return Decimal(0)
    rounded = value.quantize(Decimal((0, (1,), value.adjusted() - digits + 1)), context=_EXACT)
    if rounded.adjusted() > value.adjusted():  # 9.96 became 10.0: one digit too many
        rounded = rounded.quantize(
            Decimal((0, (1,), value.adjusted() - digits + 2)), context=_EXACT
        )
    return rounded


def _scale(values: Iterable[Decimal], unit: str) -> Scale:
    """Return the scale that suits the largest of some values of one unit."""
    scales = UNITS[unit].scales
    sizes = [value.adjusted() for value in values if value]
    if not sizes:
        return next(scale for scale in scales if scale.exponent == _ZERO_EXPONENTS.get(unit, 0))
    size = max(sizes)
    fitting = [scale for scale in scales if scale.start <= size]
    scale = fitting[-1] if fitting else scales[0]
    return scale if -3 <= size - scale.exponent < 9 else _power_of_ten(size, scales)


def _power_of_ten(size: int, scales: tuple[Scale, ...]) -> Scale:
    """Return a scale beyond the prefixes, "1.2e-18 s"."""
    plain = next(scale for scale in scales if scale.exponent == 0)
    return Scale(exponent=size, symbol=plain.symbol, start=size, power=f"e{size}")


def _in_scale(value: Decimal, scale: Scale) -> Decimal:
    return value.scaleb(-scale.exponent, context=_EXACT)


def _joined(number: str, scale: Scale) -> str:
    return f"{number}{scale.power} {scale.symbol}".rstrip()


def _not_finite(value: float, unit: str) -> str:
    if math.isnan(value):
        return "no value"
    symbol = next(scale.symbol for scale in UNITS[unit].scales if scale.exponent == 0)
    return f"{'-' if value < 0 else ''}∞ {symbol}".rstrip()


def _without_minus_zero(number: str) -> str:
    return number.lstrip("-") if not number.strip("-0.") else number
