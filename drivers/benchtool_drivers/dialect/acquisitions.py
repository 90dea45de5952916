"""The keys of [acquire]: how a record is taken, and how its end is found."""

from __future__ import annotations

from benchtool_drivers.dialect.keys import COMMANDS, QUESTION
from benchtool_drivers.dialect.records import AcquireKeys, Wait
from benchtool_drivers.dialect.tables import Forms, Key, table
from benchtool_drivers.dialect.takers import flag, number, pattern, query, whole

_INTERVAL = Key(
    take=number(0.001, 10), default=0.02, meaning="pause between two askings", example="0.05"
)
_SETTLE = Key(
    take=number(0, 60),
    default=0.0,
    meaning="pause after arming, where the state of before is answered for a while",
    example="0.1",
)

WAIT = Forms(
    tag="by",
    meaning="how the end of an acquisition is found",
    forms={
        "poll": table(
            Wait,
            {"by": "poll"},
            query=Key(take=query(), meaning="asks for the state", example='"TRIG:STAT?"'),
            done=Key(take=pattern, meaning="its answer when done", example="'^STOP$'"),
            waiting=Key(
                take=pattern,
                default="",
                meaning="its answer while the trigger is awaited",
                example="'^WAIT$'",
            ),
            interval_s=_INTERVAL,
            settle_s=_SETTLE,
        ),
        "bits": table(
            Wait,
            {"by": "bits"},
            query=Key(take=query(), meaning="asks for a register", example='"STAT:OPER:COND?"'),
            mask=Key(take=whole(1), meaning="the bits that count", example="0x30"),
            equals=Key(take=whole(0), default=0, meaning="what they are when done", example="0"),
            interval_s=_INTERVAL,
            settle_s=_SETTLE,
        ),
        "opc": table(Wait, {"by": "opc"}),
        "delay": table(
            Wait,
            {"by": "delay"},
            delay_s=Key(take=number(0, 3600), meaning="how long it takes", example="0.5"),
            opc=Key(take=flag, default=False, meaning="whether *OPC? follows", example="true"),
        ),
    },
)

_NO_WAIT = Wait(by="delay")

ACQUIRE = table(
    AcquireKeys,
    stop=Key(
        take=COMMANDS, default=(), meaning="stop it, to read what it holds", example='["STOP"]'
    ),
    arm=Key(take=COMMANDS, default=(), meaning="take one record", example='["SING"]'),
    force=Key(
        take=COMMANDS,
        default=(),
        meaning="trigger it; only when the user asks",
        example='["*TRG"]',
    ),
    abort=Key(
        take=COMMANDS, default=(), meaning="give up waiting for a trigger", example='["ABOR"]'
    ),
    wait=Key(
        take=WAIT,
        default=_NO_WAIT,
        meaning="how the end is found",
        example="""{ by = "poll", query = "TRIG:STAT?", done = '^STOP$' }""",
    ),
    timeout_s=Key(
        take=number(0.01, 86400), default=10.0, meaning="wait for the trigger", example="10.0"
    ),
    running=Key(
        take=QUESTION,
        default=None,
        meaning="asks whether it runs by itself, and the answer if so",
        example="""{ query = "TRIG:STAT?", match = '^(RUN|AUTO)$' }""",
    ),
    resume=Key(take=COMMANDS, default=(), meaning="let it run again, if it ran", example='["RUN"]'),
)


NO_ACQUIRE = AcquireKeys(
    stop=(),
    arm=(),
    force=(),
    abort=(),
    wait=_NO_WAIT,
    timeout_s=10.0,
    running=None,
    resume=(),
)
"""Of an instrument that is only read."""
