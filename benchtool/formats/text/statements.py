"""Reading the lines around the data: keys and values, whatever stands between them."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable
from itertools import pairwise
from typing import TypeVar

from benchtool.formats.text import unitwords, words
from benchtool.formats.text.intervals import FIGURE, intervals_below, intervals_in, own_delimiter
from benchtool.formats.text.layout import COMMENT, Layout, split_cells
from benchtool.formats.text.metadata import Metadata

_T = TypeVar("_T")
_PREFIXED = r"(.*?[A-Za-z)\]}µ])\s+([+-]?[.,]?\d.*)"
_GROUPED_FIGURE = r"[:=]\s*[1-9]\d{0,2}(?:,\d{3})+(?![\d,])"
_INSTRUMENT = r"(?:model|instrument|device|source instrument|ger[aä]t)(?: name| type)?"


def collect(lines: tuple[str, ...], layout: Layout) -> Metadata:
    """Collect what lines say, none of them blank."""
    rows = [(line, _tokens(line, layout)) for line in lines]
    time_unit = _first(
        _unit_statement(tokens, words.is_time_unit_key, unitwords.is_time_unit)
        for _, tokens in rows
    )
    value_unit = _first(
        _unit_statement(tokens, words.is_value_unit_key, unitwords.is_unit) for _, tokens in rows
    )
    unit = unitwords.time_unit(time_unit[0]) if time_unit else None
    intervals = tuple(
        stated for line, tokens in rows for stated in intervals_in(line, tokens, layout, unit)
    )
    return Metadata(
        intervals=intervals or tuple(intervals_below(lines, layout, unit)),
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
    delimiter = layout.delimiter if known else own_delimiter(text)
    tokens: list[str] = []
    for cell in split_cells(text, delimiter):
        for part in re.split(r"\s*[:=]\s*", cell):
            match = re.fullmatch(_PREFIXED, part)
            tokens += [match[1], match[2]] if match else [part]
    return [token for token in tokens if token]


def _thinned(line: str, tokens: list[str]) -> str | None:
    """Return the line if it says that only every so many samples were kept."""
    for key, value in pairwise(tokens):
        if words.is_decimation_key(key) and (match := re.match(FIGURE, value)) and match[0] != "1":
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
