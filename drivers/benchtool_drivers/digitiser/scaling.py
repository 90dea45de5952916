"""Volts from codes and seconds from indices: the enumerated forms of ``dialect.vocabulary``."""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Mapping

from benchtool.model.capture import Scale
from benchtool_drivers.dialect.records import DataKeys, ScaleKeys
from benchtool_drivers.dialect.vocabulary import Y_UNITS
from benchtool_drivers.digitiser.fields import Fields
from benchtool_drivers.digitiser.talk import Talk

Line = tuple[float, float]
"""Gain and offset of ``gain * value + offset``."""


def _per_inc(fields: Fields) -> Line:
    inc = fields.other_than_zero("inc")
    return inc, fields.number("origin", 0.0) - fields.number("ref", 0.0) * inc


def _per_inc_minus_origin(fields: Fields) -> Line:
    inc = fields.other_than_zero("inc")
    return inc, -fields.number("ref", 0.0) * inc - fields.number("origin")


def _origin_in_codes(fields: Fields) -> Line:
    inc = fields.other_than_zero("inc")
    return inc, -(fields.number("origin") + fields.number("ref", 0.0)) * inc


def _gain_plus(fields: Fields) -> Line:
    return fields.other_than_zero("gain"), fields.number("offset", 0.0)


def _gain_minus(fields: Fields) -> Line:
    return fields.other_than_zero("gain"), -fields.number("offset")


def _offset_in_codes(fields: Fields) -> Line:
    gain = fields.other_than_zero("gain")
    return gain, fields.number("offset") * gain


def _per_division(fields: Fields) -> float:
    return fields.other_than_zero("scale") / fields.above_zero("codes_per_division")


def _division_plus(fields: Fields) -> Line:
    gain = _per_division(fields)
    return gain, fields.number("offset", 0.0) - fields.number("ref", 0.0) * gain


def _division_minus(fields: Fields) -> Line:
    gain = _per_division(fields)
    return gain, -fields.number("offset") - fields.number("ref", 0.0) * gain


def _division_position(fields: Fields) -> Line:
    gain = _per_division(fields)
    zero = -fields.number("ref", 0.0) * gain - fields.number("position") * fields.number("scale")
    return gain, zero + fields.number("offset", 0.0)


def _bottom_top(fields: Fields) -> Line:
    low, bottom = fields.number("low_code"), fields.number("bottom")
    gain = (fields.number("top") - bottom) / (fields.number("high_code") - low)
    return gain, bottom - low * gain


_Y: Mapping[str, Callable[[Fields], Line]] = {
    "none": lambda _: (1.0, 0.0),
    "ref-inc-origin": _per_inc,
    "ref-inc-minus-origin": _per_inc_minus_origin,
    "origin-ref-inc": _origin_in_codes,
    "gain-plus-offset": _gain_plus,
    "gain-minus-offset": _gain_minus,
    "offset-gain": _offset_in_codes,
    "division-plus-offset": _division_plus,
    "division-minus-offset": _division_minus,
    "division-position": _division_position,
    "bottom-top": _bottom_top,
}


def find_scale(talk: Talk, fields: Fields, *, of_codes: bool) -> Scale:
    """Return how volts come from the samples.

    Raises:
        ReplyError: If the figures give no scale (``bad-preamble``).
    """
    keys: ScaleKeys = talk.dialect.body.scale
    data: DataKeys = talk.dialect.body.data
    try:
        gain, offset = _Y[keys.y](fields)
        factor = Y_UNITS[keys.y_unit]
        if keys.probe == "apart":
            factor *= fields.above_zero("probe")
        step_v = abs(gain * factor) * data.code_step if of_codes else None
        return Scale(gain=gain * factor, offset=offset * factor, step_v=step_v)
    except (ValueError, ZeroDivisionError) as error:
        raise talk.wrong(
            f"the preamble gives no scale: {error}",
            hint="Compare the fields of the dialect's preamble with the manual.",
            command=talk.dialect.body.preamble.query or data.query,
            got=", ".join(f"{name} {text}" for name, text in fields.texts().items()),
            code="bad-preamble",
        ) from None


def _index_dt(fields: Fields, _n: int) -> Line:
    return fields.above_zero("dt"), fields.number("t0", 0.0)


def _index_rate(fields: Fields, _n: int) -> Line:
    return 1.0 / fields.above_zero("rate"), fields.number("t0", 0.0)


def _from_reference(fields: Fields, _n: int) -> Line:
    dt_s = fields.above_zero("dt")
    return dt_s, fields.number("xorigin", 0.0) - fields.number("xref", 0.0) * dt_s


def _centred(fields: Fields, n: int) -> Line:
    dt_s = fields.above_zero("dt")
    return dt_s, fields.number("delay", 0.0) - n / 2 * dt_s


def _span(fields: Fields, n: int) -> Line:
    return fields.above_zero("span") / n, fields.number("t0", 0.0)


def _divisions(fields: Fields, n: int) -> Line:
    span_s = fields.above_zero("time_scale") * fields.above_zero("divisions")
    return span_s / n, fields.number("delay", 0.0) - span_s / 2


_X: Mapping[str, Callable[[Fields, int], Line]] = {
    "index-dt": _index_dt,
    "index-rate": _index_rate,
    "xref-dt-xorigin": _from_reference,
    "centred": _centred,
    "span": _span,
    "divisions": _divisions,
}
_X_FIELD = {"index-rate": "rate", "span": "span", "divisions": "time_scale"}


def find_time(talk: Talk, fields: Fields, n_points: int) -> Line:
    """Return the sample interval and the time of the first sample, both in seconds."""
    keys: ScaleKeys = talk.dialect.body.scale
    return _X[keys.x](fields, n_points)


def printed_u_rel(talk: Talk, fields: Fields) -> float:
    """Return the relative standard uncertainty of the interval from its printed digits.

    A figure that fills five digits or more may have been cut there: half of the last one is taken
    as the half-width of a uniform distribution (JCGM 100:2008, 4.3.7). A shorter one is exact.
    """
    keys: ScaleKeys = talk.dialect.body.scale
    text = fields.texts().get(_X_FIELD.get(keys.x, "dt"), "")
    found = re.search(r"(\d*)[.,]?(\d*)", text.strip().lstrip("+-"))
    digits = (found[1] + found[2]).lstrip("0").rstrip("0") if found else ""
    if not 5 <= len(digits) <= 14:
        return 0.0
    return 0.5 / int(digits) / math.sqrt(3)
