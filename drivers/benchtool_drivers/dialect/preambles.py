"""The forms of the preamble: where the figures that describe the samples come from."""

from __future__ import annotations

import re
from typing import Any

from benchtool_drivers.dialect.keys import CHANNEL
from benchtool_drivers.dialect.records import Magic, OrderFlag, Place, PreambleKeys
from benchtool_drivers.dialect.tables import Forms, Key, Table, table
from benchtool_drivers.dialect.takers import (
    Spot,
    choice,
    either,
    listing,
    mapping,
    query,
    shown,
    some_text,
    text,
    whole,
)
from benchtool_drivers.dialect.vocabulary import BLOCK_TYPES, FIELD_UNITS, ORDERS


def _constant(value: Any, spot: Spot) -> str:
    if isinstance(value, bool) or not isinstance(value, int | float | str):
        spot.wrong(f"{shown(value)} must be a number or a text")
    return str(value)


def _block_type(value: Any, spot: Spot) -> str:
    """Take the type of a number, or s and the bytes of a text."""
    if isinstance(value, str) and re.fullmatch(r"s[1-9]\d{0,2}", value):
        return value
    return str(choice(*BLOCK_TYPES, "s16")(value, spot))


_PLACE = table(
    Place,
    at=Key(take=whole(0, 1 << 20), meaning="bytes before it", example="16"),
    type=Key(take=_block_type, meaning="its type", example='"f8"'),
)
_ORDER_FLAG = table(
    OrderFlag,
    at=Key(take=whole(0, 1 << 20), meaning="bytes before it", example="8"),
    type=Key(take=choice("u1", "u2", "u4"), default="u2", meaning="its type", example='"u2"'),
    little_if=Key(take=whole(0), default=1, meaning="its value for little", example="1"),
)
_MAGIC = table(
    Magic,
    at=Key(take=whole(0, 1 << 20), default=0, meaning="bytes before it", example="0"),
    text=Key(take=some_text, meaning="what must stand there", example='"DESC"'),
)

_EXTRA = {
    "ask": Key(
        take=mapping(query(*CHANNEL)),
        default={},
        meaning="further figures that have a query of their own",
        example='{ points = "ACQ:POIN?" }',
    ),
    "constant": Key(
        take=mapping(_constant),
        default={},
        meaning="figures that nothing tells and you state",
        example="{ codes_per_division = 25 }",
    ),
    "units": Key(
        take=mapping(choice(*FIELD_UNITS)),
        default={},
        meaning="units of fields that are bare numbers and not in s, V, Hz",
        example='{ dt = "ns" }',
    ),
}
_NONE: dict[str, Any] = {"names": (), "keys": {}, "places": {}}
_QUERY = Key(take=query(*CHANNEL), meaning="asks for the preamble", example='"WAV:PRE?"')
_KEYS = Key(
    take=mapping(some_text),
    meaning="a field and the key it stands under",
    example='{ points = "NPT", dt = "TINT" }',
)


def _form(kind: str, **keys: Key) -> Table:
    """Return the table of one kind; ``fields`` goes into the record under the kind's own name."""

    def make(**given: Any) -> PreambleKeys:
        found = given.pop("fields", {})
        home = "names" if isinstance(found, tuple) else "places" if kind == "block" else "keys"
        fields = {home: found}
        return PreambleKeys(**{**_NONE, **given, **fields})

    return table(make, {"kind": kind}, **keys, **_EXTRA)


_SEPARATOR = Key(take=some_text, default=",", meaning="stands between fields", example='";"')
_PAIR_SEPARATOR = Key(take=some_text, default=";", meaning="stands between pairs", example='","')
_ASSIGN = Key(take=text, default=" ", meaning="stands between a key and its value", example='"="')

PREAMBLE = Forms(
    tag="kind",
    meaning="where the figures that describe the samples come from",
    forms={
        "csv": _form(
            "csv",
            query=_QUERY,
            separator=_SEPARATOR,
            fields=Key(
                take=listing(some_text, least=1),
                meaning='the fields in their order; "-" for one that does not matter',
                example='["format", "-", "points", "dt"]',
            ),
        ),
        "keyvalue": _form(
            "keyvalue", query=_QUERY, separator=_PAIR_SEPARATOR, assign=_ASSIGN, fields=_KEYS
        ),
        "queries": _form("queries"),
        "constant": _form("constant"),
        "block": _form(
            "block",
            query=Key(
                take=query(*CHANNEL),
                default="",
                meaning="asks for the descriptor; without it, it leads the block of samples",
                example='"DESC?"',
            ),
            fields=Key(
                take=mapping(_PLACE),
                meaning="a field and where it stands",
                example='{ points = { at = 20, type = "u4" } }',
            ),
            order=Key(
                take=either((dict, _ORDER_FLAG), (object, choice(*ORDERS))),
                default="big",
                meaning="byte order of the descriptor, or the flag that tells",
                example='{ at = 8, type = "u2", little_if = 1 }',
            ),
            magic=Key(
                take=_MAGIC,
                default=None,
                meaning="what it begins with",
                example='{ text = "DESC" }',
            ),
        ),
        "block-text": _form(
            "block-text",
            separator=_PAIR_SEPARATOR,
            assign=_ASSIGN,
            fields=_KEYS,
            ends=Key(
                take=text,
                default="",
                meaning="what ends the text that leads the block, where nothing says its size",
                example=r'"\n\n"',
            ),
            size=Key(
                take=whole(0, 1 << 20), default=0, meaning="bytes of that text", example="512"
            ),
        ),
        "lead-text": _form(
            "lead-text",
            separator=_PAIR_SEPARATOR,
            assign=_ASSIGN,
            fields=Key(
                take=either((list, listing(some_text, least=1)), (object, _KEYS.take)),
                meaning="fields with their keys, or a list of them in their order",
                example='{ points = "NPT", dt = "TINT" }',
            ),
            ends=Key(
                take=text,
                default="",
                meaning="what stands between the text and samples that are printed too",
                example='":"',
            ),
        ),
        "dif": _form("dif"),
    },
)
