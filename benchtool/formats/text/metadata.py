"""What the lines around the data say: interval, rate, units, start, instrument."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Iterator
from itertools import pairwise
from typing import TypeVar

from benchtool.formats.text import words
from benchtool.formats.text.cells import number
from benchtool.formats.text.layout import COMMENT, Layout, split_cells
from benchtool.frozen import frozen_record

_T = TypeVar("_T")
_NUMBER = (
    r"[+-]?(?:\d{1,3}(?:[,. \u00a0\u202f']\d{3})+(?!\d)(?:[.,]\d+)?|\d+(?:[.,]\d+)?|[.,]\d+)"
    r"(?:[eE][+-]?\d+)?"
)
_PREFIXED = r"(.*?[A-Za-z)\]}µ])\s+([+-]?[.,]?\d.*)"
_GROUPS = r"[+-]?[1-9]\d{0,2}(?:(?:,\d{3})+|(?:\.\d{3})+)(?!\d)"
_FRACTIONS = r"\d,\d"
_GROUPED_FIGURE = r"[:=]\s*[1-9]\d{0,2}(?:,\d{3})+(?![\d,])"
_DROP_GAPS = str.maketrans("", "", " \u00a0\u202f'")
_SCALED = {"k": 1e3, "K": 1e3, "M": 1e6, "G": 1e9, "m": 1e-3, "u": 1e-6, "µ": 1e-6, "n": 1e-9}
_INSTRUMENT = r"(?:model|instrument|device|source instrument|ger[aä]t)(?: name| type)?"


@frozen_record(eq=False)
class Stated:
    """A figure that the metadata state, and the words it was found in.

    Attributes:
        value: The figure, in seconds.
        evidence: The words.
        assumed_unit: Whether its unit had to be assumed.
        rounding: Half its last printed digit, relative to it.
    """

    value: float
    evidence: str
    assumed_unit: bool = False
    rounding: float = 0.0


@frozen_record(eq=False)
class Metadata:
    """What the lines around the data say.

    Attributes:
        intervals: Sample intervals in seconds, one a statement.
        time_unit: Unit of the time column.
        value_unit: Unit of the values.
        start: Time of the first sample, as printed.
        instrument: Name of the instrument.
        thinned: What the file says of samples that were left out, empty where nothing.
    """

    intervals: tuple[Stated, ...] = ()
    time_unit: tuple[words.TimeUnit, str] | None = None
    value_unit: tuple[str, str] | None = None
    instrument: str | None = None
    thinned: str = ""


def read_metadata(lines: Iterable[str], layout: Layout) -> Metadata:
    """Collect what ``lines`` (those around the data, comments among them) say."""
    lines = tuple(line for line in lines if line.strip())
    if not lines:
        return Metadata()
    rows = [(line, _tokens(line, layout)) for line in lines]
    time_unit = _first(
        _unit_statement(tokens, words.is_time_unit_key, words.is_time_unit) for _, tokens in rows
    )
    value_unit = _first(
        _unit_statement(tokens, words.is_value_unit_key, words.is_unit) for _, tokens in rows
    )
    unit = words.time_unit(time_unit[0]) if time_unit else None
    intervals = tuple(
        stated for line, tokens in rows for stated in _intervals_in(line, tokens, layout, unit)
    )
    return Metadata(
        intervals=intervals or tuple(_intervals_below(lines, layout, unit)),
        time_unit=(unit, time_unit[1]) if time_unit and unit else None,
        value_unit=value_unit,
        instrument=_first(_instrument(tokens) for _, tokens in rows),
        thinned=_first(_thinned(line, tokens) for line, tokens in rows) or "",
    )


def _first(found: Iterable[_T | None]) -> _T | None:
    return next((item for item in found if item is not None), None)


def _tokens(line: str, layout: Layout) -> list[str]:
    """Cut a line into keys and values, whatever stands between them."""
    text = COMMENT.sub("", line, count=1).strip().lstrip("; ")
    text = re.sub(_GROUPED_FIGURE, lambda match: match[0].replace(",", "'"), text)
    known = layout.delimiter not in ("", " ") and layout.delimiter in text
    delimiter = layout.delimiter if known else _own_delimiter(text)
    tokens: list[str] = []
    for cell in split_cells(text, delimiter):
        for part in re.split(r"\s*[:=]\s*", cell):
            match = re.fullmatch(_PREFIXED, part)
            tokens += [match[1], match[2]] if match else [part]
    return [token for token in tokens if token]


def _own_delimiter(text: str) -> str:
    return next((d for d in ("\t", ";", ",") if d in re.sub(_FRACTIONS, "", text)), "")


def _intervals_in(
    line: str, tokens: list[str], layout: Layout, unit: words.TimeUnit | None
) -> Iterator[Stated]:
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
    key, unit = split_unit(token)
    if words.is_rate_key(key) or words.is_interval_key(key) or not words.is_rate_key(token):
        return key, unit
    return token, "sps" if unit else ""


def _intervals_below(
    lines: Iterable[str], layout: Layout, unit: words.TimeUnit | None
) -> Iterator[Stated]:
    """Yield intervals that stand in the line below their name, beyond the columns of the data."""
    rows = [split_cells(line, layout.delimiter or _own_delimiter(line) or ",") for line in lines]
    for names, figures in pairwise(rows):
        for name, figure in zip(names, figures, strict=False):
            key, own_unit = split_unit(name)
            if not words.is_interval_key(key):
                continue
            evidence = f"{figure!r} below {name!r}"
            shared = _Beside(own_unit=own_unit, is_rate=False, unit=unit, evidence=evidence)
            yield from _figures([figure], shared, layout)


def _bare_rate(tokens: list[str], layout: Layout, evidence: str) -> Iterator[Stated]:
    """A figure in samples a second, or in time a sample, needs no word beside it."""
    for token, after in pairwise([*tokens, ""]):
        match = re.match(_NUMBER, token)
        text = (token[match.end() :].strip() or after) if match else ""
        if match is None or "hz" in text.lower():
            continue
        if not (words.rate_factor(text) or words.is_per_sample(text)):
            continue
        stated = [
            Stated(value=interval_s, evidence=evidence, rounding=_rounding(match[0]))
            for value in _values(match[0], layout)
            if value > 0 and (interval_s := _in_unit(value, text)) is not None
        ]
        if stated:
            yield from stated
            return


def split_unit(key: str) -> tuple[str, str]:
    """Split ``Interval (us)``, ``dt/us`` or ``dt_us`` into name and unit."""
    match = re.fullmatch(r"(.*)[(\[{<]\s*([^()\[\]{}<>]*?)\s*[)\]}>]\s*(?:#\d+)?", key)
    if match:
        return match[1].strip(), match[2]
    if words.rate_factor(key.rpartition(" ")[2]):
        return key.strip(), ""
    for mark in ("/", "_", " in ", ",", ":", ".", " "):
        name, found, unit = key.rpartition(mark)
        if found and unit.lower() == "min" and not words.is_time_name(name):
            continue  # the least value, not minutes
        if found and name.strip() and _is_known_unit(unit):
            return name.strip(), unit.strip()
    return key.strip(), ""


def _is_known_unit(unit: str) -> bool:
    return bool(words.time_unit(unit) or words.volt_factor(unit) or words.rate_factor(unit))


@frozen_record(eq=False)
class _Beside:
    """What stands beside a figure: the unit in its key, what it is, the unit of the column."""

    own_unit: str
    is_rate: bool
    unit: words.TimeUnit | None
    evidence: str


def _figures(values: list[str], shared: _Beside, layout: Layout) -> Iterator[Stated]:
    """Yield what the figures after a key state: both readings of ``1,234``, one a channel."""
    seen: set[float] = set()
    for i, token in enumerate(values):
        text = token.strip()
        match = re.match(_NUMBER, text)
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
    known = _first(_in_unit(value, text) for text in told)
    if known is not None:
        return known, False
    if inline and inline not in _SCALED and inline.lower() not in words.COUNT_UNITS:
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
    rate, time = words.rate_factor(unit), words.time_unit(unit)
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


def _thinned(line: str, tokens: list[str]) -> str | None:
    """Return the line if it says that only every so many samples were kept."""
    for key, value in pairwise(tokens):
        if words.is_decimation_key(key) and (match := re.match(_NUMBER, value)) and match[0] != "1":
            return line.strip()[:60]
    return None


def _unit_statement(
    tokens: list[str], is_key: Callable[[str], bool], is_unit: Callable[[str], bool]
) -> tuple[str, str] | None:
    for key, value in pairwise(tokens):
        if is_key(key) and is_unit(value):
            return value.strip("\"'()[] "), f"metadata '{key}: {value}'"
    return None


def _instrument(tokens: list[str]) -> str | None:
    if len(tokens) > 1 and re.fullmatch(_INSTRUMENT, words.normal(tokens[0])):
        return "".join(c for c in tokens[1] if c.isprintable())[:80]
    return None
