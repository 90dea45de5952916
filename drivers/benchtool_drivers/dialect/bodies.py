"""The keys that only a dialect of kind "digitiser" has."""

from __future__ import annotations

from typing import Any

from benchtool_drivers.dialect.acquisitions import ACQUIRE, NO_ACQUIRE
from benchtool_drivers.dialect.keys import CHANNEL
from benchtool_drivers.dialect.preambles import PREAMBLE
from benchtool_drivers.dialect.records import (
    ChunkKeys,
    DataKeys,
    Lookup,
    ScaleKeys,
)
from benchtool_drivers.dialect.tables import Forms, Key, table
from benchtool_drivers.dialect.takers import (
    Spot,
    choice,
    command,
    either,
    flag,
    listing,
    mapping,
    name,
    number,
    query,
    some_text,
    text,
    whole,
)
from benchtool_drivers.dialect.vocabulary import DTYPES, ORDERS, X_FORMS, Y_FORMS, Y_UNITS

WINDOW = (*CHANNEL, "start", "stop", "offset", "count", "n")


def _lookup(**given: Any) -> Lookup:
    return Lookup(names=tuple(given["from"].split("+")), map=given["map"])


def _worded(*known: str) -> Any:
    """Return a taker of one of some words, or of a lookup that ends in one of them."""
    looked_up = table(
        _lookup,
        from_=Key(take=some_text, meaning="the field that tells, or a+b", example='"width"'),
        map=Key(take=mapping(choice(*known)), meaning="what each word means", example="{}"),
    )
    return either((dict, looked_up), (object, choice(*known)))


def _points(value: Any, spot: Spot) -> Any:
    looked_up = table(
        _lookup,
        from_=Key(take=some_text, meaning="the field that tells", example='"format"'),
        map=Key(take=mapping(whole(1)), meaning="points for each word", example="{}"),
    )
    return looked_up(value, spot) if isinstance(value, dict) else whole(1)(value, spot)


def _range(value: Any, spot: Spot) -> tuple[int, int] | None:
    low_high = isinstance(value, list) and len(value) == 2
    if not low_high or not all(isinstance(item, int) for item in value) or value[0] >= value[1]:
        spot.wrong("must be the least and the greatest code, such as [0, 4095]")
        return None
    return value[0], value[1]


def _trailer(value: Any, spot: Spot) -> str:
    found = text(value, spot)
    if not found.isascii() or len(found) > 16:
        spot.wrong("must be ASCII, at most 16 characters")
    return found


_CODE = whole(-(1 << 31), 1 << 32)

DATA = table(
    DataKeys,
    query=Key(take=query(*WINDOW), meaning="asks for the samples", example='"WAV:DATA?"'),
    wrap=Key(
        take=choice(
            *("definite", "indefinite", "ascii", "hex", "counted-checksum"),
        ),
        default="definite",
        meaning="what is round the samples: #<digits><length>, #0, a text, hex, %",
        example='"definite"',
    ),
    lead=Key(
        take=flag,
        default=False,
        meaning="whether a text stands before the block in the same answer",
        example="true",
    ),
    dtype=Key(
        take=_worded(*DTYPES),
        default="ascii",
        meaning="type of a sample: u unsigned, i signed, f float, bytes; ascii for a text",
        example='"i2"',
    ),
    order=Key(
        take=_worded(*ORDERS),
        default="big",
        meaning="byte order: big (first byte highest) or little",
        example='"little"',
    ),
    trailer=Key(
        take=_trailer,
        default="\n",
        meaning='what follows a block: "\\n", "\\r\\n", "" or, behind a lead, more',
        example='""',
    ),
    length_unit=Key(
        take=choice("bytes", "points"),
        default="bytes",
        meaning="what the length in a block's header counts",
        example='"points"',
    ),
    skip=Key(
        take=either((str, name), (object, whole(0))),
        default=0,
        meaning="bytes before the samples of each block, or the field that says so",
        example="16",
    ),
    padding=Key(
        take=whole(0, 4096), default=0, meaning="bytes after the samples of each block", example="1"
    ),
    separator=Key(
        take=some_text, default=",", meaning="between the values of a text", example='";"'
    ),
    shift=Key(
        take=whole(0, 31),
        default=0,
        meaning="bits to shift codes right by before scaling (left-justified samples)",
        example="4",
    ),
    code_step=Key(
        take=whole(1, 1 << 24),
        default=1,
        meaning="codes between neighbouring levels, where the low bits are unused",
        example="16",
    ),
    code_range=Key(
        take=_range,
        default=None,
        meaning="least and greatest code there can be; others are refused",
        example="[0, 4095]",
    ),
    missing_codes=Key(
        take=listing(_CODE), default=(), meaning="codes that mean no sample", example="[-32768]"
    ),
    envelope=Key(
        take=_worded("none", "pairs", "refuse"),
        default="none",
        meaning="whether samples come as pairs of least and greatest",
        example='"pairs"',
    ),
    pairs=Key(
        take=flag,
        default=False,
        meaning="whether each value has its time before it",
        example="true",
    ),
    bits=Key(
        take=mapping(whole(0, 31)),
        default={},
        meaning="logic channels: a name and its bit",
        example="{ D0 = 0, D1 = 1 }",
    ),
)

_TOTAL = Key(
    take=query(*CHANNEL),
    default="",
    meaning="asks for the length of the record, apart from the preamble",
    example='"ACQ:POIN?"',
)
_MOST = Key(take=_points, default=None, meaning="most samples in one transfer", example="250000")
_FIRST = Key(take=whole(0, 1), default=0, meaning="number of the first sample", example="1")
_SET = Key(
    take=listing(command(*WINDOW)),
    default=(),
    meaning="choose the window",
    example='["WAV:STAR {start}", "WAV:STOP {stop}"]',
)
_JOIN = Key(
    take=flag, default=False, meaning="send window and query as one message", example="true"
)
_WHOLE = Key(
    take=flag,
    default=True,
    meaning="choose the whole record before the preamble is asked for",
    example="false",
)
_INCLUSIVE = Key(
    take=flag, default=True, meaning="whether {stop} is still part of the window", example="false"
)
_UNIT = Key(
    take=choice("samples", "bytes"),
    default="samples",
    meaning="what {start}, {stop}, {offset} and {count} number",
    example='"bytes"',
)
_WINDOWED = {"total": _TOTAL, "first": _FIRST, "unit": _UNIT}
_CHOSEN = {"set": _SET, "join": _JOIN, "whole": _WHOLE, "max_points": _MOST}

CHUNK = Forms(
    tag="by",
    meaning="how a long record is read in pieces",
    forms={
        "none": table(ChunkKeys, {"by": "none"}, total=_TOTAL),
        "start-stop": table(
            ChunkKeys, {"by": "start-stop"}, **_WINDOWED, inclusive=_INCLUSIVE, **_CHOSEN
        ),
        "offset-count": table(ChunkKeys, {"by": "offset-count"}, **_WINDOWED, **_CHOSEN),
        "query-args": table(
            ChunkKeys, {"by": "query-args"}, **_WINDOWED, inclusive=_INCLUSIVE, max_points=_MOST
        ),
        "pages": table(
            ChunkKeys,
            {"by": "pages", "whole": False},
            total=_TOTAL,
            first=_FIRST,
            set=_SET,
            join=_JOIN,
            max_points=Key(
                take=_points, meaning="samples of a page; the last may have fewer", example="1000"
            ),
        ),
        "next": table(ChunkKeys, {"by": "next"}, total=_TOTAL),
    },
)

SCALE = table(
    ScaleKeys,
    y=Key(take=choice(*Y_FORMS), meaning="volts from codes", example='"ref-inc-origin"'),
    x=Key(
        take=choice(*X_FORMS),
        default="index-dt",
        meaning="seconds from indices",
        example='"span"',
    ),
    y_unit=Key(take=choice(*Y_UNITS), default="V", meaning="unit that comes out", example='"mV"'),
    probe=Key(
        take=choice("included", "apart"),
        default="included",
        meaning="whether the figures are at the probe's tip, or the field probe multiplies them",
        example='"apart"',
    ),
    invalid=Key(
        take=listing(number(-1e39, 1e39)),
        default=(9.9e37, -9.9e37, 9.91e37),
        meaning="volts that mean no sample",
        example="[9.91e37]",
    ),
)

BODY = {
    "acquire": Key(take=ACQUIRE, default=NO_ACQUIRE, meaning="how a record is taken", example=""),
    "preamble": Key(
        take=PREAMBLE,
        meaning="a table with the figures that describe the samples",
        example='{ kind = "queries", ask = { points = "ACQ:POIN?", dt = "HOR:INT?" } }',
    ),
    "data": Key(
        take=DATA, meaning="a table with how the samples travel", example='{ query = "DATA?" }'
    ),
    "chunk": Key(
        take=CHUNK, default=ChunkKeys(by="none"), meaning="how it is read in pieces", example=""
    ),
    "scale": Key(
        take=SCALE,
        meaning="a table with how codes become volts",
        example='{ y = "none", x = "index-dt" }',
    ),
}
