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
_NUMBER = re.compile(r"[+-]?(?:\d+(?:[.,]\d+)?|[.,]\d+)(?:[eE][+-]?\d+)?")
_PREFIXED = re.compile(r"(.*?[A-Za-z)\]}µ])\s+([+-]?[.,]?\d.*)")
_SCALED = {"k": 1e3, "K": 1e3, "M": 1e6, "G": 1e9, "m": 1e-3, "u": 1e-6, "µ": 1e-6, "n": 1e-9}
_INSTRUMENT = re.compile(r"(?:model|instrument|device|source instrument|ger[aä]t)(?: name| type)?")


@frozen_record(eq=False)
class Stated:
    """A figure that the metadata state, and the words it was found in."""

    value: float
    evidence: str
    assumed_unit: bool = False


@frozen_record(eq=False)
class Metadata:
    """What the lines around the data say.

    Attributes:
        intervals: Sample intervals in seconds, one a statement.
        time_unit: Unit of the time column.
        value_unit: Unit of the values.
        start: Time of the first sample, as printed.
        instrument: Name of the instrument.
    """

    intervals: tuple[Stated, ...] = ()
    time_unit: tuple[words.TimeUnit, str] | None = None
    value_unit: tuple[str, str] | None = None
    instrument: str | None = None


def read_metadata(lines: Iterable[str], layout: Layout) -> Metadata:
    """Collect what ``lines`` (those around the data, comments among them) say."""
    lines = tuple(lines)
    rows = [(line, _tokens(line, layout)) for line in lines]
    time_unit = _first(_unit_statement(r, words.is_time_unit_key) for _, r in rows)
    value_unit = _first(_unit_statement(r, words.is_value_unit_key) for _, r in rows)
    unit = words.time_unit(time_unit[0]) if time_unit else None
    intervals = tuple(
        stated
        for line, tokens in rows
        for stated in _intervals_in(line, tokens, layout.decimal, unit)
    )
    return Metadata(
        intervals=intervals or tuple(_intervals_below(lines, layout, unit)),
        time_unit=(unit, time_unit[1]) if time_unit and unit else None,
        value_unit=value_unit,
        instrument=_first(_instrument(tokens) for _, tokens in rows),
    )


def _first(found: Iterable[_T | None]) -> _T | None:
    return next((item for item in found if item is not None), None)


def _tokens(line: str, layout: Layout) -> list[str]:
    """Cut a line into keys and values, whatever stands between them."""
    text = COMMENT.sub("", line, count=1).strip()
    delimiter = layout.delimiter if layout.delimiter not in ("", " ") else _own_delimiter(text)
    tokens: list[str] = []
    for cell in split_cells(text, delimiter):
        for part in re.split(r"\s*[:=]\s*", cell):
            match = _PREFIXED.fullmatch(part)
            tokens += [match[1], match[2]] if match else [part]
    return [token for token in tokens if token]


def _own_delimiter(text: str) -> str:
    return next((d for d in ("\t", ";", ",") if d in text), "")


def _intervals_in(
    line: str, tokens: list[str], decimal: str, unit: words.TimeUnit | None
) -> Iterator[Stated]:
    for i, token in enumerate(tokens[:-1]):
        key, own_unit = split_unit(token)
        is_rate, is_interval = words.is_rate_key(key), words.is_interval_key(key)
        if not (is_rate or is_interval):
            continue
        stated = _figure(tokens[i + 1 : i + 3], own_unit, decimal, is_rate=is_rate, unit=unit)
        if stated is not None:
            value, assumed = stated
            evidence = f"line {line.strip()[:60]!r}"
            yield Stated(value=value, evidence=evidence, assumed_unit=assumed)
            return
    yield from _bare_rate(line, tokens, decimal)


def _intervals_below(
    lines: Iterable[str], layout: Layout, unit: words.TimeUnit | None
) -> Iterator[Stated]:
    """Yield intervals that stand in the line below their name, beyond the columns of the data."""
    rows = [split_cells(line, layout.delimiter or ",") for line in lines]
    for names, figures in pairwise(rows):
        for name, figure in zip(names, figures, strict=False):
            key, own_unit = split_unit(name)
            if not words.is_interval_key(key):
                continue
            stated = _figure([figure], own_unit, layout.decimal, is_rate=False, unit=unit)
            if stated is not None:
                value, assumed = stated
                evidence = f"{figure!r} below {name!r}"
                yield Stated(value=value, evidence=evidence, assumed_unit=assumed)


def _bare_rate(line: str, tokens: list[str], decimal: str) -> Iterator[Stated]:
    """A figure in samples a second, or in time a sample, needs no word beside it."""
    for token, after in pairwise([*tokens, ""]):
        match = _NUMBER.match(token)
        text = (token[match.end() :].strip() or after) if match else ""
        if match is None or "hz" in text.lower():
            continue
        if not (words.rate_factor(text) or words.is_per_sample(text)):
            continue
        value = _value(match[0], decimal)
        interval_s = _in_unit(value, text) if value > 0 else None
        if interval_s is not None:
            yield Stated(value=interval_s, evidence=f"line {line.strip()[:60]!r}")
            return


def split_unit(key: str) -> tuple[str, str]:
    """Split ``Interval (us)``, ``dt/us`` or ``dt_us`` into name and unit."""
    match = re.fullmatch(r"(.*)[(\[{<]\s*([^()\[\]{}<>]*?)\s*[)\]}>]\s*", key)
    if match:
        return match[1].strip(), match[2]
    for mark in ("/", "_", " in ", ", ", " "):
        name, found, unit = key.rpartition(mark)
        if found and name.strip() and _is_known_unit(unit):
            return name.strip(), unit.strip()
    return key.strip(), ""


def _is_known_unit(unit: str) -> bool:
    return bool(words.time_unit(unit) or words.volt_factor(unit) or words.rate_factor(unit))


def _figure(
    values: list[str], own_unit: str, decimal: str, *, is_rate: bool, unit: words.TimeUnit | None
) -> tuple[float, bool] | None:
    """Return the interval in seconds, and whether its unit had to be assumed."""
    match = _NUMBER.match(values[0].strip()) if values else None
    if match is None:
        return None
    value = _value(match[0], decimal)
    if not 0 < value < float("inf"):
        return None
    inline = values[0].strip()[match.end() :].strip()
    beside = values[1].strip() if len(values) > 1 else ""
    known = _first(_in_unit(value, text) for text in (inline, own_unit, beside))
    if known is not None:
        return known, False
    scale = _SCALED.get(inline, 1.0)
    if is_rate:
        return 1 / (value * scale), True
    if unit is not None and not inline:
        return unit.seconds(value), False
    return value * scale, True


def _in_unit(value: float, unit: str) -> float | None:
    """Return the interval that ``value`` is in a unit of rate or of time."""
    rate, time = words.rate_factor(unit), words.time_unit(unit)
    if rate:
        return 1 / (value * rate)
    return time.seconds(value) if time else None


def _value(text: str, decimal: str) -> float:
    """Return a number of the metadata, which need not follow the decimal mark of the data."""
    if "," in text and "." not in text:
        return number(text, ",")
    return number(text, "." if "." in text else decimal)


def _unit_statement(tokens: list[str], is_key: Callable[[str], bool]) -> tuple[str, str] | None:
    for key, value in pairwise(tokens):
        if is_key(key) and words.is_unit(value):
            return value.strip("\"'()[] "), f"metadata '{key}: {value}'"
    return None


def _instrument(tokens: list[str]) -> str | None:
    if len(tokens) > 1 and _INSTRUMENT.fullmatch(words.normal(tokens[0])):
        return "".join(c for c in tokens[1] if c.isprintable())[:80]
    return None
