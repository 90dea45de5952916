"""The keys that only a dialect of kind "counter" has."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchtool.model.counted import COUNTED_NAMES
from benchtool_drivers.dialect.acquisitions import ACQUIRE, NO_ACQUIRE
from benchtool_drivers.dialect.counter_rules import describe_counter, find_conflicts
from benchtool_drivers.dialect.counting import (
    CounterKeys,
    FirstEdge,
    FunctionKeys,
    GateKeys,
    ReadingKeys,
    ResolutionKeys,
    StampKeys,
    TakeKeys,
)
from benchtool_drivers.dialect.keys import CHANNEL
from benchtool_drivers.dialect.kinds import Kind
from benchtool_drivers.dialect.tables import Forms, Key, table
from benchtool_drivers.dialect.takers import (
    Spot,
    choice,
    command,
    either,
    listing,
    mapping,
    number,
    pattern,
    query,
    some_text,
    whole,
)
from benchtool_drivers.dialect.vocabulary import ORDERS

ASKED = (*CHANNEL, "function", "n")
TIMES: Mapping[str, float] = {"s": 1.0, "ms": 1e-3, "us": 1e-6, "ns": 1e-9, "ps": 1e-12}
"""Units of times, in seconds."""

READING_UNITS: Mapping[str, Mapping[str, float]] = {
    **dict.fromkeys(("t_high", "t_low", "period"), TIMES),
    "frequency": {"Hz": 1.0, "kHz": 1e3, "MHz": 1e6},
    "duty": {"%": 1e-2, "1": 1.0},
}
"""Units that readings of each quantity may have, in SI units."""

NO_READING = (9.91e37, 9.9e37, -9.9e37)
"""SCPI-1999, volume 1, 7.2.1.4 and 7.2.1.5: not a number, and the infinities (from memory)."""

_ALL_UNITS = tuple(dict.fromkeys(unit for units in READING_UNITS.values() for unit in units))
_DTYPES = ("f4", "f8", "i4", "i8", "u4", "u8")
_TIME = Key(take=choice(*TIMES), default="s", meaning="unit of its answer", example='"us"')

_FUNCTION = table(
    FunctionKeys,
    word=Key(take=some_text, meaning="the instrument's word for it", example='"PWID"'),
    unit=Key(
        take=choice(*_ALL_UNITS),
        default="",
        meaning="unit of its readings; s and Hz where left out, a duty has none of its own",
        example='"%"',
    ),
    per=Key(
        take=choice("interval", "gate"),
        default="",
        meaning="what one reading is: one interval, or an average over the gate",
        example='"gate"',
    ),
)


def _plain_word(value: Any, spot: Spot) -> FunctionKeys:
    return FunctionKeys(word=some_text(value, spot), unit="", per="")


_ONE = either((dict, _FUNCTION), (object, _plain_word))


def _functions(value: Any, spot: Spot) -> Mapping[str, Any]:
    """Take the words for the quantities; what is left out of each goes by its quantity."""
    found = mapping(_ONE, known=COUNTED_NAMES)(value, spot)
    return {name: _filled(name, item, spot.at(name)) for name, item in found.items()}


def _filled(name: str, item: FunctionKeys | None, spot: Spot) -> FunctionKeys | None:
    units = READING_UNITS.get(name)
    if item is None or units is None:
        return None
    if name == "duty" and not item.unit:
        spot.wrong('needs its unit: { word = "DCYC", unit = "%" } for percent, "1" for a ratio')
    elif item.unit and item.unit not in units:
        spot.at("unit").wrong(f"{item.unit!r} is no unit of it: {', '.join(units)}")
    alone = name in ("t_high", "t_low")
    return FunctionKeys(
        word=item.word,
        unit=item.unit or next(iter(units)),
        per=item.per or ("interval" if alone else "gate"),
    )


_CONFIGURE = Key(
    take=listing(command(*ASKED)),
    default=(),
    meaning="choose what is counted, and how many readings",
    example='["TRIG:COUN {n}"]',
)
_N = Key(take=whole(1), default=100, meaning="readings where none are asked for", example="100")
_MOST = Key(take=whole(1), default=10_000, meaning="most readings in one transfer", example="1000")

TAKE = Forms(
    tag="by",
    meaning="how N readings are taken",
    forms={
        "array": table(TakeKeys, {"by": "array"}, configure=_CONFIGURE, n=_N, most=_MOST),
        "count": table(TakeKeys, {"by": "count"}, configure=_CONFIGURE, n=_N, most=_MOST),
        "loop": table(TakeKeys, {"by": "loop"}, configure=_CONFIGURE, n=_N),
    },
)

_FIRST = either(
    (
        dict,
        table(
            FirstEdge,
            query=Key(take=query(*CHANNEL), meaning="asks for it", example='"TST:FIRS?"'),
            rising=Key(take=pattern, meaning="its answer where it rises", example="'^POS'"),
        ),
    ),
    (object, choice("rising", "falling")),
)

STAMPS = table(
    StampKeys,
    edges=Key(
        take=choice("both", "levels", "rising", "falling"),
        meaning="which edges: both in turn, each with the level after it, or one direction",
        example='"both"',
    ),
    first=Key(
        take=_FIRST,
        default="",
        meaning="direction of the first of both edges, or a query that tells",
        example="""{ query = "TST:FIRS?", rising = '^POS' }""",
    ),
    unit=Key(
        take=choice(*TIMES, "ticks"), default="s", meaning="unit of the stamps", example='"ticks"'
    ),
)

GATE = table(
    GateKeys,
    query=Key(
        take=query(*CHANNEL, "function"), meaning="asks for the gate", example='"FREQ:GATE?"'
    ),
    unit=_TIME,
    single=Key(
        take=pattern,
        default="",
        meaning="its answer where each reading is one interval",
        example="'^OFF$'",
    ),
)

RESOLUTION = table(
    ResolutionKeys,
    s=Key(
        take=number(0, 1), default=None, meaning="step of one interval in seconds", example="1e-9"
    ),
    query=Key(
        take=either((str, lambda value, spot: query(*CHANNEL)(value, spot) if value else "")),
        default="",
        meaning="asks for it, where it is no fixed figure",
        example='"SENS:RES?"',
    ),
    unit=_TIME,
)

DATA = table(
    ReadingKeys,
    query=Key(take=query(*ASKED), meaning="asks for the readings", example='"FETC?"'),
    wrap=Key(
        take=choice("ascii", "definite"),
        default="ascii",
        meaning="a text, or a block #<digits><length>",
        example='"definite"',
    ),
    dtype=Key(take=choice(*_DTYPES), default="f8", meaning="number in a block", example='"f8"'),
    order=Key(take=choice(*ORDERS), default="big", meaning="its byte order", example='"little"'),
    separator=Key(take=some_text, default=",", meaning="between printed numbers", example='";"'),
    trailer=Key(
        take=choice("\n", "\r\n", ""), default="\n", meaning="what follows a block", example='""'
    ),
    missing=Key(
        take=listing(number(-1e308, 1e308)),
        default=NO_READING,
        meaning="what marks that there is no reading",
        example="[9.91e37]",
    ),
)

BODY: Mapping[str, Key] = {
    "functions": Key(
        take=_functions,
        default={},
        meaning="the instrument's words for t_high, t_low, period, frequency, duty",
        example='{ period = "PER" }',
    ),
    "take": Key(take=TAKE, meaning="how N readings are taken", example='{ by = "loop" }'),
    "stamps": Key(
        take=STAMPS,
        default=None,
        meaning="time stamps of edges, in place of functions",
        example='{ edges = "both", first = "rising" }',
    ),
    "gate": Key(
        take=GATE, default=None, meaning="asks for the gate", example='{ query = "FREQ:GATE?" }'
    ),
    "resolution": Key(take=RESOLUTION, meaning="step of a single interval", example="{ s = 1e-9 }"),
    "acquire": Key(
        take=ACQUIRE,
        default=NO_ACQUIRE,
        meaning="starts the readings",
        example='{ arm = ["INIT"] }',
    ),
    "data": Key(take=DATA, meaning="how readings travel", example='{ query = "FETC?" }'),
}


COUNTER = Kind(keys=BODY, make=CounterKeys, conflicts=find_conflicts, describe=describe_counter)
