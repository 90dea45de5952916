"""Loading a dialect: every fault at once, each with its key, its line and the nearest known key."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from importlib import import_module
from pathlib import Path
from typing import Any

from benchtool.designs.lines import find_lines, line_of
from benchtool.designs.notation import key_text
from benchtool.designs.syntax import decode, parse_toml
from benchtool.designs.vocabulary import listed, nearest
from benchtool.errors import DesignError, DesignFault, InputError
from benchtool_drivers.dialect.keys import (
    CHANNELS,
    EMPTY_SETUP,
    LINK,
    PLAIN_LINK,
    PROBE,
    SETTINGS,
    SETUP,
    TOP,
)
from benchtool_drivers.dialect.records import Dialect, ProbeKeys
from benchtool_drivers.dialect.tables import Key, table
from benchtool_drivers.dialect.takers import Flaw, Spot, shown

KINDS: Mapping[str, str] = {
    "digitiser": "benchtool_drivers.dialect.kinds:DIGITISER",
    "counter": "benchtool_drivers.dialect.counters:COUNTER",
}
"""Each kind of dialect, and where its own keys stand."""

_LARGEST_BYTES = 1 << 18
_HINT = "correct the keys named; `benchtool instruments dialects --keys` lists them all"


def load_dialect(path: Path, *, source: str | None = None) -> Dialect:
    """Return the dialect in a file.

    Args:
        path: The file.
        source: What it is called in messages; its path where nothing is given.

    Raises:
        InputError: If it cannot be read.
        DesignError: If it is no sound dialect (``dialect``); carries every fault with its line.
    """
    source = source or str(path)
    try:
        with path.open("rb") as file:
            content = file.read(_LARGEST_BYTES + 1)
    except OSError as error:
        missing = isinstance(error, FileNotFoundError)
        raise InputError(
            f"{source} cannot be read: {error.strerror}",
            hint="Check the path; `benchtool instruments dialects` lists what there is.",
            code="no-such-file" if missing else "unreadable",
        ) from None
    if len(content) > _LARGEST_BYTES:
        raise _error([Flaw(path=(), message="is larger than 256 KiB")], "", source)
    try:
        text = decode(content, source=source)
    except DesignError as error:
        raise _of_a_dialect(error) from None
    return parse_dialect(text, source=source)


def parse_dialect(text: str, *, source: str = "") -> Dialect:
    """Return the dialect in a text.

    Raises:
        DesignError: If it is no sound dialect (``dialect``); carries every fault with its line.
    """
    try:
        document = parse_toml(text, source=source)
    except DesignError as error:
        raise _of_a_dialect(error) from None
    spot = Spot()
    dialect = _take(document, spot, source=source, text=text)
    if spot.flaws or dialect is None:
        raise _error(spot.flaws, text, source)
    return dialect


def _take(document: dict[str, Any], spot: Spot, *, source: str, text: str) -> Dialect | None:
    kind = document.get("kind")
    if kind not in KINDS:
        word = "is missing" if kind is None else f"{shown(kind)} is not known"
        near = nearest(kind, KINDS) if isinstance(kind, str) else None
        spot.at("kind").wrong(f"{word}: what it is for, {listed(map(repr, KINDS), 'or')}", near)
        return None
    module, _, name = KINDS[str(kind)].partition(":")
    form = getattr(import_module(module), name)
    rest = {key: value for key, value in document.items() if key != "kind"}

    def make(**taken: Any) -> Dialect:
        own = {key: taken.pop(key) for key in form.keys}
        del taken["schema"]
        return Dialect(**taken, kind=str(kind), body=form.make(**own), source=source, text=text)

    keys = {**_COMMON, **form.keys}
    dialect: Dialect | None = table(make, **keys)(rest, spot)
    if dialect is not None:
        spot.flaws.extend(form.conflicts(dialect))
    return dialect


_COMMON = {
    **TOP,
    "link": Key(take=LINK, default=PLAIN_LINK, meaning="how messages travel", example=""),
    "probe": Key(
        take=PROBE,
        default=ProbeKeys(ask=()),
        meaning="harmless queries that recognise it; without them only --dialect chooses it",
        example='{ ask = [{ query = "FORM?", match = "^ASC" }] }',
    ),
    "channel": Key(
        take=CHANNELS, meaning="a table with its channels", example='{ names = ["CH1"] }'
    ),
    "setup": Key(take=SETUP, default=EMPTY_SETUP, meaning="agrees on the transfer", example=""),
    "settings": SETTINGS,
}


def common_keys() -> Mapping[str, Key]:
    """Return the top-level keys that every kind has."""
    return _COMMON


def _error(flaws: Iterable[Flaw], text: str, source: str) -> DesignError:
    lines = find_lines(text)
    faults = [
        DesignFault(
            key=key_text(flaw.path),
            message=flaw.message,
            file=source,
            line=line_of(flaw.path, lines),
            near=flaw.near,
        )
        for flaw in flaws
    ]
    faults.sort(key=lambda fault: fault.line or 0)
    first = faults[0]
    place = f"{source or 'the dialect'}{f', line {first.line}' if first.line else ''}"
    message = (
        f"{place}: {first.key}: {first.message}"
        if len(faults) == 1
        else f"{source or 'the dialect'} has {len(faults)} faults"
    )
    return DesignError(message, hint=_HINT, faults=tuple(faults), code="dialect")


def _of_a_dialect(error: DesignError) -> DesignError:
    """Return a fault of form under the code and with the words of dialect files."""
    message = error.message.replace("the design", "the dialect")
    return DesignError(message, hint=_HINT, faults=error.faults, code="dialect")
