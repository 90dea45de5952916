"""What a dialect file says, as frozen records; what each key means stands in ``keys``."""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any

from benchtool.frozen import frozen_record

_HEADER = re.compile(r"\s*:?([A-Za-z*][\w:*]*)\s+(?=\S)")


@frozen_record
class Question:
    """A query, and the pattern that its answer has to show."""

    query: str
    match: str = ""
    optional: bool = False


@frozen_record
class Kept:
    """A setting that is put back at the end: its query, and the command before its answer."""

    query: str
    set: str


@frozen_record
class Lookup:
    """A word from the preamble: the fields it is joined of, and what each word stands for."""

    names: tuple[str, ...]
    map: Mapping[str, str]


@frozen_record
class LinkKeys:
    """How messages travel."""

    write_termination: str
    read_termination: str
    timeout_s: float
    block_timeout_s: float
    deadline_s: float | None
    query_delay_s: float
    echo: bool
    prompt: str
    headers: bool
    header_off: tuple[str, ...]
    error_query: str
    error_none: str
    error_bits: int | None
    device_clear: str
    decimal: str
    max_message: int

    def plain(self, answer: str, command: str) -> str:
        """Take the header off an answer, where the instrument puts one there."""
        if not (self.headers or self.header_off):
            return answer
        found = _HEADER.match(answer)
        asked = command.partition("?")[0].rpartition(":")[2].upper()
        if found and found[1].rpartition(":")[2].upper().startswith(asked[:3]):
            return answer[found.end() :]
        return answer


@frozen_record
class ProbeKeys:
    """Harmless queries that tell whether an instrument speaks the dialect."""

    ask: tuple[Question, ...]


@frozen_record
class ChannelKeys:
    """Names of the channels, and how one is chosen."""

    names: tuple[str, ...]
    default: tuple[str, ...]
    select: tuple[str, ...]
    interleaved: bool


@frozen_record
class SetupKeys:
    """How the transfer is agreed on; nothing that is measured changes."""

    keep: tuple[Kept, ...]
    commands: tuple[str, ...]
    verify: tuple[Question, ...]


@frozen_record
class Wait:
    """How the end of an acquisition is found."""

    by: str
    query: str = ""
    done: str = ""
    waiting: str = ""
    mask: int = 0
    equals: int = 0
    interval_s: float = 0.02
    settle_s: float = 0.0
    delay_s: float = 0.0
    opc: bool = False


@frozen_record
class AcquireKeys:
    """How a record is taken."""

    stop: tuple[str, ...]
    arm: tuple[str, ...]
    force: tuple[str, ...]
    abort: tuple[str, ...]
    wait: Wait
    timeout_s: float
    running: Question | None
    resume: tuple[str, ...]


@frozen_record
class Place:
    """Where a field stands in a binary descriptor."""

    at: int
    type: str


@frozen_record
class OrderFlag:
    """Where a binary descriptor says in which order its bytes stand."""

    at: int
    type: str
    little_if: int


@frozen_record
class Magic:
    """What a binary descriptor begins with."""

    at: int
    text: str


@frozen_record
class PreambleKeys:
    """Where the figures that describe the samples come from."""

    kind: str
    query: str = ""
    names: tuple[str, ...] = ()
    keys: Mapping[str, str]
    places: Mapping[str, Place]
    separator: str = ","
    assign: str = " "
    ends: str = ""
    size: int = 0
    order: str | OrderFlag = "big"
    magic: Magic | None = None
    ask: Mapping[str, str]
    constant: Mapping[str, str]
    units: Mapping[str, str]

    @property
    def in_block(self) -> bool:
        """Whether the figures come in the same block as the samples."""
        return self.kind in ("block", "block-text", "lead-text", "dif") and not self.query

    @property
    def fields(self) -> frozenset[str]:
        """The names of all fields that it gives."""
        own = _DIF_FIELDS if self.kind == "dif" else {*self.names, *self.keys, *self.places}
        if isinstance(self.order, OrderFlag):
            own = {*own, "order"}
        return frozenset(own - {"-"}) | frozenset({*self.ask, *self.constant})


_DIF_FIELDS = {"points", "dt", "t0", "gain", "offset", "format"}


@frozen_record
class DataKeys:
    """How the samples travel and are coded."""

    query: str
    wrap: str
    lead: bool
    dtype: str | Lookup
    order: str | Lookup
    trailer: str
    length_unit: str
    skip: int | str
    padding: int
    separator: str
    shift: int
    code_step: int
    code_range: tuple[int, int] | None
    missing_codes: tuple[int, ...]
    envelope: str | Lookup
    pairs: bool
    bits: Mapping[str, int]


@frozen_record
class ChunkKeys:
    """How a long record is read in pieces."""

    by: str
    total: str = ""
    first: int = 0
    unit: str = "samples"
    inclusive: bool = True
    set: tuple[str, ...] = ()
    join: bool = False
    whole: bool = True
    max_points: int | Lookup | None = None


@frozen_record
class ScaleKeys:
    """How codes become volts, and indices become seconds."""

    y: str
    x: str
    y_unit: str
    probe: str
    invalid: tuple[float, ...]


@frozen_record
class DigitiserKeys:
    """What only a dialect of kind "digitiser" has."""

    acquire: AcquireKeys
    preamble: PreambleKeys
    data: DataKeys
    chunk: ChunkKeys
    scale: ScaleKeys


@frozen_record
class Dialect:
    """A dialect.

    Attributes:
        name: Its name.
        basis: Where its author read what it says.
        kind: What it is for; tells what ``body`` is.
        link: How messages travel.
        probe: How it is recognised.
        channel: Its channels.
        setup: How the transfer is agreed on.
        settings: Settings that are read and recorded: a name and its query.
        body: What only its kind has.
        source: The file.
        text: The text of the file.
    """

    name: str
    basis: str
    kind: str
    link: LinkKeys
    probe: ProbeKeys
    channel: ChannelKeys
    setup: SetupKeys
    settings: Mapping[str, str]
    body: Any
    source: str = ""
    text: str = ""

    @property
    def is_bundled(self) -> bool:
        """Whether it came with the program."""
        return self.source.startswith("bundled:")
