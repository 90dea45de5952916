r"""Description files: how the lines of a logger that is not ours are read.

A TOML text. All that it may hold, with the values that count where a key is left out::

    schema = 1                     # required
    name = "bench-logger"          # required: letters, digits and -
    channel = "OUT"

    [line]
    columns = ["time", "level"]    # required: seq, time or interval, level, skip, in their order
    delimiter = ","                # one character, "tab" or "space" (any run of blanks)
    comment = ""                   # what a line that holds no edge begins with
    header_lines = 0               # lines at the very start that are passed over
    seq_bits = 0                   # width of the sequence number; 0: it never starts again

    [time]
    unit = "ticks"                 # required: ticks, s, ms, us or ns
    tick_hz = 1e6                  # required with ticks, and only then
    wrap_bits = 0                  # with ticks: width of their counter; 0: it never starts again
    decimal = "."                  # or ",", where the times have decimals

    [level]                        # only, and always, where there is a column of that name
    high = "1"
    low = "0"
    of = "after"                   # or "before": the level that lasted until the edge

    [edges]                        # only, and always, where there is no level column
    first = "rising"               # or "falling": the first line that comes

``interval`` is the length since the edge before, ``time`` counts from any moment. Two lines that
follow each other must lie less than half a turn of the tick counter apart. Without a level, edges
alternate; if one is lost then, nothing says which is which, and reading ends, unless the lines are
numbered. Without a sequence number a lost line is noticed by its level alone.
"""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path
from typing import Any

from benchtool.designs.lines import find_lines, line_of
from benchtool.designs.notation import key_text
from benchtool.designs.syntax import decode, parse_toml
from benchtool.errors import DesignError, DesignFault, InputError
from benchtool_drivers.streams.keys import Flaw, find_flaws
from benchtool_drivers.streams.layout import PS_HZ, Layout

CODE = "stream-description"
_LARGEST_BYTES = 1 << 16
_HINT = "correct the keys named; `benchtool explain stream-description` lists all there are"
_UNIT_PS = {"s": 10**12, "ms": 10**9, "us": 10**6, "ns": 10**3}


def load_description(path: str | Path) -> Layout:
    """Return what a description file says of the lines of a stream.

    Raises:
        InputError: If the file cannot be read: ``no-such-file`` or ``unreadable``.
        DesignError: ``stream-description``: if it has faults; carries each with its line.
    """
    try:
        with Path(path).open("rb") as file:
            content = file.read(_LARGEST_BYTES + 1)
    except OSError as error:
        missing = isinstance(error, FileNotFoundError)
        raise InputError(
            f"{str(path)!r} cannot be read: {error.strerror or error}",
            hint="check the path of the description file",
            code="no-such-file" if missing else "unreadable",
        ) from None
    source = str(path)
    if len(content) > _LARGEST_BYTES:
        raise _error([Flaw(path=(), message="is larger than 64 KiB")], "", source)
    try:
        text = decode(content, source=source)
    except DesignError as error:
        raise _renamed(error) from None
    return parse_description(text, source=source)


def parse_description(text: str, *, source: str = "") -> Layout:
    """Return what a description says of the lines of a stream.

    Args:
        text: The TOML text.
        source: File name for messages.

    Raises:
        DesignError: ``stream-description``: if it has faults; carries each with its line.
    """
    try:
        document = parse_toml(text, source=source)
    except DesignError as error:
        raise _renamed(error) from None
    flaws = find_flaws(document)
    if flaws:
        raise _error(flaws, text, source)
    return _layout(document)


def _renamed(error: DesignError) -> DesignError:
    """Return the error of a text that is no TOML as one of a description."""
    return DesignError(error.message, hint=error.hint, faults=error.faults, code=CODE)


def _error(flaws: Iterable[Flaw], text: str, source: str) -> DesignError:
    lines = find_lines(text)
    faults = sorted(
        (
            DesignFault(
                key=key_text(flaw.path),
                message=flaw.message,
                file=source,
                line=line_of(flaw.path, lines),
                near=flaw.near,
            )
            for flaw in flaws
        ),
        key=lambda fault: fault.line or 0,
    )
    first, name = faults[0], source or "the description"
    place = f"{name}{f', line {first.line}' if first.line else ''}"
    message = (
        f"{place}: {first.key}: {first.message}".replace(": : ", ": ")
        if len(faults) == 1
        else f"{name} has {len(faults)} faults"
    )
    return DesignError(message, hint=_HINT, faults=tuple(faults), code=CODE)


def _layout(document: dict[str, Any]) -> Layout:
    """Return the layout that a description without faults stands for."""
    line, time = document["line"], document["time"]
    level = document.get("level", {})
    first = document.get("edges", {}).get("first")
    delimiter = {"tab": "\t", "space": " "}.get(*[line.get("delimiter", ",")] * 2)
    ticks = time["unit"] == "ticks"
    return Layout(
        name=document["name"],
        columns=tuple(line["columns"]),
        tick_hz=float(time["tick_hz"]) if ticks else PS_HZ,
        levels=((level["low"].encode(), 0), (level["high"].encode(), 1)) if level else (),
        delimiter=delimiter.encode(),
        comment=line.get("comment", "").encode(),
        header_lines=line.get("header_lines", 0),
        padded=True,
        decimal=time.get("decimal", ".").encode(),
        unit_ticks=1 if ticks else _UNIT_PS[time["unit"]],
        wrap_bits=time.get("wrap_bits", 0),
        seq_bits=line.get("seq_bits", 0),
        level_before=level.get("of", "after") == "before",
        first_level=None if first is None else first == "rising",
        channel=document.get("channel", "OUT"),
    )
