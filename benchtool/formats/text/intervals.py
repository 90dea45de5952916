"""Sample intervals and rates that lines of text state, with the figures in them."""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator
from itertools import pairwise

from benchtool.formats.text import unitwords, words
from benchtool.formats.text.cells import number
from benchtool.formats.text.layout import Layout, split_cells
from benchtool.formats.text.metadata import Stated
from benchtool.formats.text.unitwords import TimeUnit
from benchtool.frozen import frozen_record

FIGURE = (
    r"[+-]?(?:\d{1,3}(?:[,. \u00a0\u202f']\d{3})+(?!\d)(?:[.,]\d+)?|\d+(?:[.,]\d+)?|[.,]\d+)"
    r"(?:[eE][+-]?\d+)?"
)
"""Pattern of a number, its groups parted or not."""

_GROUPS = r"[+-]?[1-9]\d{0,2}(?:(?:,\d{3})+|(?:\.\d{3})+)(?!\d)"
_FRACTIONS = r"\d,\d"
_DROP_GAPS = str.maketrans("", "", " \u00a0\u202f'")
_SCALED = {"k": 1e3, "K": 1e3, "M": 1e6, "G": 1e9, "m": 1e-3, "u": 1e-6, "µ": 1e-6, "n": 1e-9}


def own_delimiter(text: str) -> str:
    """Return what parts the cells of a line that is no row of the data."""
    return next((d for d in ("\t", ";", ",") if d in re.sub(_FRACTIONS, "", text)), "")


def intervals_in(
    line: str, tokens: list[str], layout: Layout, unit: TimeUnit | None
) -> Iterator[Stated]:
    """Yield the intervals that a line states.

    Args:
        line: The line as printed, for evidence.
        tokens: Its keys and values.
        layout: Layout of the data, whose decimal mark the figures may follow.
        unit: Unit of the time column, where the lines say it.
    """
    evidence = f"line {line.strip()[:60]!r}"
    for i, token in enumerate(tokens[:-1]):
        key, own_unit = _key(token)
        is_rate, is_interval = words.is_rate_key(key), words.is_interval_key(key)
        if not (is_rate or is_interval):
            continue
        shared = _Beside(own_unit=own_unit, is_rate=is_rate, unit=unit, evidence=evidence)
        stated = list(_figures(tokens[i + 1 :], shared, layout))
        if stated:
            yield from stated
            return
    if not words.is_foreign_rate(line):
        yield from _bare_rate(tokens, layout, evidence)


def _key(token: str) -> tuple[str, str]:
    """Split a token into key and unit; ``samples per second`` is a key as a whole."""
    key, unit = words.split_unit(token)
    if words.is_rate_key(key) or words.is_interval_key(key) or not words.is_rate_key(token):
        return key, unit
    return token, "sps" if unit else ""


def intervals_below(
    lines: Iterable[str], layout: Layout, unit: TimeUnit | None
) -> Iterator[Stated]:
    """Yield intervals that stand in the line below their name, beyond the columns of the data."""
    rows = [split_cells(line, layout.delimiter or own_delimiter(line) or ",") for line in lines]
    for names, figures in pairwise(rows):
        for name, figure in zip(names, figures, strict=False):
            key, own_unit = words.split_unit(name)
            if not words.is_interval_key(key):
                continue
            evidence = f"{figure!r} below {name!r}"
            shared = _Beside(own_unit=own_unit, is_rate=False, unit=unit, evidence=evidence)
            yield from _figures([figure], shared, layout)


def _bare_rate(tokens: list[str], layout: Layout, evidence: str) -> Iterator[Stated]:
    """A figure in samples a second, or in time a sample, needs no word beside it."""
    for token, after in pairwise([*tokens, ""]):
        match = re.match(FIGURE, token)
        text = (token[match.end() :].strip() or after) if match else ""
        if match is None or "hz" in text.lower():
            continue
        if not (unitwords.rate_factor(text) or unitwords.is_per_sample(text)):
            continue
        stated = [
            Stated(value=interval_s, evidence=evidence, rounding=_rounding(match[0]))
            for value in _values(match[0], layout)
            if value > 0 and (interval_s := _in_unit(value, text)) is not None
        ]
        if stated:
            yield from stated
            return


@frozen_record(eq=False)
class _Beside:
    """What stands beside a figure: the unit in its key, what it is, the unit of the column."""

    own_unit: str
    is_rate: bool
    unit: TimeUnit | None
    evidence: str


def _figures(values: list[str], shared: _Beside, layout: Layout) -> Iterator[Stated]:
    """Yield what the figures after a key state: both readings of ``1,234``, one a channel."""
    seen: set[float] = set()
    for i, token in enumerate(values):
        text = token.strip()
        match = re.match(FIGURE, text)
        if match is None or (i and match.end() < len(text)):
            return
        for value in _values(match[0], layout):
            found = _seconds([text[match.end() :].strip(), *values[i + 1 : i + 2]], value, shared)
            if found is None or found[0] in seen:
                continue
            seen.add(found[0])
            yield Stated(
                value=found[0],
                evidence=shared.evidence,
                assumed_unit=found[1],
                rounding=_rounding(match[0]),
            )


def _seconds(texts: list[str], value: float, shared: _Beside) -> tuple[float, bool] | None:
    """Return the interval in seconds, and whether its unit had to be assumed."""
    if not 0 < value < float("inf"):
        return None
    inline, beside = texts[0], texts[1].strip() if len(texts) > 1 else ""
    told = (inline, inline.partition(" ")[0], shared.own_unit, beside)
    known = next((s for s in (_in_unit(value, text) for text in told) if s is not None), None)
    if known is not None:
        return known, False
    if inline and inline not in _SCALED and inline.lower() not in unitwords.COUNT_UNITS:
        return None  # a unit that is none of time
    scale = _SCALED.get(inline, 1.0)
    if shared.is_rate:
        return 1 / (value * scale), True
    if shared.unit is not None and not inline:
        return shared.unit.seconds(value), False
    return value * scale, True


def _rounding(text: str) -> float:
    """Return half the last digit of a figure relative to it; none of ``5e-06`` or ``200000``."""
    mantissa = text.lower().partition("e")[0]
    digits = "".join(c for c in mantissa if c.isdigit()).lstrip("0")
    whole = not set(mantissa) & set(".,") and digits.rstrip("0") != digits
    if whole or len(digits.rstrip("0")) < 3:
        return 0.0  # a round figure is meant exactly
    return 0.5 / float(digits)


def _in_unit(value: float, unit: str) -> float | None:
    """Return the interval that ``value`` is in a unit of rate or of time."""
    rate, time = unitwords.rate_factor(unit), unitwords.time_unit(unit)
    if rate:
        return 1 / (value * rate)
    return time.seconds(value) if time else None


def _values(text: str, layout: Layout) -> list[float]:
    """Return the readings of a number in the metadata, which need not follow the data's mark."""
    text = text.translate(_DROP_GAPS)
    mark = next((m for m in ".," if m in text), "")
    if "." in text and "," in text:
        return [number(text, "." if text.rfind(".") > text.rfind(",") else ",")]
    if not mark:
        return [number(text, ".")]
    if not re.fullmatch(_GROUPS, text):
        return [number(text, mark)]
    grouped, fraction = number(text, "," if mark == "." else "."), number(text, mark)
    if text.count(mark) > 1 or (mark == "," and _shows(layout, ".")):
        return [grouped]
    if mark == "." and not _shows(layout, ","):
        return [fraction]
    return [fraction] if mark == "," and _shows(layout, ",") else [grouped, fraction]


def _shows(layout: Layout, mark: str) -> bool:
    """Say whether the numbers of the data show that their decimal mark is ``mark``."""
    if layout.decimal != mark:
        return False
    return any(mark in row[i] for row in layout.rows for i in layout.fields)
