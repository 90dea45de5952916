"""The keys that dialects of every kind have."""

from __future__ import annotations

import re

from benchtool_drivers.dialect.records import (
    ChannelKeys,
    Kept,
    LinkKeys,
    ProbeKeys,
    Question,
    SetupKeys,
)
from benchtool_drivers.dialect.tables import Key, Table, table
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
    pattern,
    query,
    some_text,
    text,
    whole,
)

CHANNEL = ("channel",)
COMMANDS = listing(command(*CHANNEL))
NO_ERROR = r"^\s*\+?0\b"
"""What an empty error queue answers: SCPI-1999, volume 2, SYSTem:ERRor, begins with 0."""


def _terminator(value: object, spot: Spot) -> str:
    found = text(value, spot)
    if not re.fullmatch(r"[\r\n\0;]{1,2}", found):
        spot.wrong(r'must be "\n", "\r\n" or "\r"')
    return found


QUESTION = table(
    Question,
    query=Key(take=query(*CHANNEL), meaning="a query", example='"FORM?"'),
    match=Key(take=pattern, default="", meaning="what its answer must show", example="'^INT'"),
    optional=Key(take=flag, default=False, meaning="whether it may stay without", example="true"),
)

KEPT = table(
    Kept,
    query=Key(take=query(*CHANNEL), meaning="asks for a setting", example='"FORM?"'),
    set=Key(take=command(*CHANNEL), meaning="the command before its answer", example='"FORM"'),
)

LINK = table(
    LinkKeys,
    write_termination=Key(
        take=_terminator, default="\n", meaning="ends each command", example=r'"\n"'
    ),
    read_termination=Key(
        take=_terminator, default="\n", meaning="ends each text answer", example=r'"\r\n"'
    ),
    timeout_s=Key(
        take=number(0.01, 600), default=5.0, meaning="longest wait for an answer", example="5.0"
    ),
    block_timeout_s=Key(
        take=number(0.01, 3600),
        default=30.0,
        meaning="longest wait for the first byte of a block",
        example="30.0",
    ),
    deadline_s=Key(
        take=number(0.01, 86400),
        default=None,
        meaning="longest time for a whole block",
        example="600.0",
    ),
    query_delay_s=Key(
        take=number(0, 10),
        default=0.0,
        meaning="pause between a query and reading its answer",
        example="0.05",
    ),
    echo=Key(
        take=flag, default=False, meaning="whether it repeats each command first", example="true"
    ),
    prompt=Key(take=text, default="", meaning="what it prints when ready", example='"> "'),
    headers=Key(
        take=flag,
        default=False,
        meaning="whether an answer begins with the header of its query, which is taken off",
        example="true",
    ),
    header_off=Key(
        take=listing(command()),
        default=(),
        meaning="commands that make answers plain; a header that stays is taken off",
        example='["HEAD OFF"]',
    ),
    error_query=Key(
        take=either((str, lambda value, spot: query()(value, spot) if value else "")),
        default="SYST:ERR?",
        meaning='reads one error; "" where the instrument has none',
        example='"*ESR?"',
    ),
    error_none=Key(
        take=pattern, default=NO_ERROR, meaning='what "no error" looks like', example=r"'^0\b'"
    ),
    error_bits=Key(
        take=whole(1, 255),
        default=None,
        meaning="bits of the answer that are errors, where it is a number (60 for *ESR?)",
        example="60",
    ),
    device_clear=Key(
        take=choice("auto", "none"),
        default="auto",
        meaning="whether a device clear may be sent after a failure",
        example='"none"',
    ),
    decimal=Key(
        take=choice(".", ","), default=".", meaning="the decimal sign of answers", example='","'
    ),
    max_message=Key(
        take=whole(16, 65536), default=256, meaning="longest command, in bytes", example="80"
    ),
)

PROBE = table(
    ProbeKeys,
    ask=Key(
        take=listing(QUESTION, least=1),
        meaning="harmless queries with what their answers look like",
        example="""[{ query = "WAV:PRE?", match = '^([^,]+,){9}[^,]+$' }]""",
    ),
)

CHANNELS = table(
    ChannelKeys,
    names=Key(
        take=listing(name, least=1), meaning="names of all channels", example='["CH1", "CH2"]'
    ),
    default=Key(
        take=listing(name),
        default=(),
        meaning="those that are read where none is asked for; the first one otherwise",
        example='["CH1"]',
    ),
    select=Key(
        take=COMMANDS, default=(), meaning="choose a channel", example='["WAV:SOUR {channel}"]'
    ),
    interleaved=Key(
        take=flag,
        default=False,
        meaning="whether one transfer holds all channels, sample by sample in turn",
        example="true",
    ),
)

SETUP = table(
    SetupKeys,
    keep=Key(
        take=listing(KEPT),
        default=(),
        meaning="settings of the transfer that are put back at the end",
        example='[{ query = "FORM?", set = "FORM" }]',
    ),
    commands=Key(
        take=COMMANDS,
        default=(),
        meaning="agree on the transfer: format, width, byte order",
        example='["FORM INT,16"]',
    ),
    verify=Key(
        take=listing(QUESTION),
        default=(),
        meaning="queries that must then answer so",
        example="""[{ query = "FORM?", match = '^INT,16' }]""",
    ),
)

SETTINGS = Key(
    take=mapping(query(*CHANNEL)),
    default={},
    meaning="settings to read and record: a name and its query",
    example='{ "trigger level" = "TRIG:LEV?" }',
)

EMPTY_SETUP = SetupKeys(keep=(), commands=(), verify=())


def defaults_of(keys: Table) -> dict[str, object]:
    """Return what holds where a table is left out."""
    return {key: entry.default for key, entry in keys.keys.items()}


PLAIN_LINK = LinkKeys(**defaults_of(LINK))  # type: ignore[arg-type]  # each key has its default

TOP = {
    "schema": Key(take=whole(1, 1), meaning="version of this structure", example="1"),
    "name": Key(take=name, meaning="name of the dialect", example='"list-of-volts"'),
    "basis": Key(
        take=some_text, meaning="where you read what it says", example='"manual, chapter 7"'
    ),
}
