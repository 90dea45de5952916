"""The user's kit: instruments and probes by name, in ``kit.toml`` of the user's folder.

::

    [instrument.left]
    resource = "TCPIP::192.0.2.7::hislip0::INSTR"
    dialect = "positional-preamble"
    timebase = "2.5 ppm"
    calibration_due = 2031-03-02
    channels = { OUT = "CH1", NODE = "CH2" }
    probe = "ten-to-one"

    [probe.ten-to-one]
    R = "10M"
    C = "12p"

Every key may be left out but the load of a probe.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import replace
from datetime import date, datetime
from pathlib import Path
from types import MappingProxyType
from typing import Any

from benchtool.designs.lines import find_lines, line_of
from benchtool.designs.syntax import decode, parse_toml
from benchtool.designs.vocabulary import nearest
from benchtool.errors import DesignError, DesignFault, InputError, UnitError, UsageError
from benchtool.frozen import frozen_record
from benchtool.model.kit import Kit, KitInstrument, KitProbe
from benchtool.units import parse

Table = Mapping[str, Any]
_CODE = "kit"
_HINT = "Correct the lines named; see: benchtool explain kit"


@frozen_record
class _Flaw:
    path: tuple[str, ...]
    message: str
    near: str | None = None


class _FlawError(Exception):
    """A value that is none; carries what is wrong with it."""


def load_kit(path: Path) -> Kit:
    """Return the kit in a file.

    Raises:
        InputError: If the file cannot be read.
        DesignError: If it has faults (``kit``); carries all of them with their lines.
    """
    source = str(path)
    try:
        content = path.read_bytes()
    except OSError as error:
        raise InputError(
            f"{source} cannot be read: {error.strerror}", hint="Check the file and its permissions."
        ) from error
    return parse_kit(decode(content, source=source), source=source)


def parse_kit(text: str, *, source: str = "") -> Kit:
    """Return the kit in a TOML text.

    Raises:
        DesignError: As ``load_kit``.
    """
    document = parse_toml(text, source=source)
    flaws: list[_Flaw] = [*_unknown(document, ("instrument", "probe"), ())]
    probes = {
        name: probe
        for name, table in _tables(document, "probe", flaws)
        if (probe := _probe(name, table, flaws)) is not None
    }
    instruments = {
        name: _instrument(name, table, probes, flaws)
        for name, table in _tables(document, "instrument", flaws)
    }
    if flaws:
        raise _error(flaws, text, source)
    return Kit(
        file=source, instruments=MappingProxyType(instruments), probes=MappingProxyType(probes)
    )


def find_instrument(kit: Kit, name: str, today: str) -> KitInstrument:
    """Return the instrument of a name.

    Args:
        kit: The kit.
        name: Its name.
        today: The day on which a calibration has to hold, ISO 8601.

    Raises:
        UsageError: If there is none (``not-in-kit``).
    """
    if name not in kit.instruments:
        raise _not_in_kit("instrument", name, kit, kit.instruments)
    found = kit.instruments[name]
    days = (found.calibration_due, found.probe.calibration_due if found.probe else None)
    return replace(found, is_overdue=any(day is not None and day < today for day in days))


def find_probe(kit: Kit, name: str) -> KitProbe:
    """Return the probe of a name.

    Raises:
        UsageError: If there is none (``not-in-kit``).
    """
    if name in kit.probes:
        return kit.probes[name]
    raise _not_in_kit("probe", name, kit, kit.probes)


def _not_in_kit(kind: str, name: str, kit: Kit, known: Mapping[str, object]) -> UsageError:
    there = f"It holds: {', '.join(known)}." if known else f"It holds no {kind} yet."
    return UsageError(f"{kit.file} has no {kind} {name!r}", hint=there, code="not-in-kit")


def _tables(
    document: Table, key: str, flaws: list[_Flaw]
) -> Iterator[tuple[str, dict[str, object]]]:
    entries = document.get(key, {})
    if not isinstance(entries, dict):
        flaws.append(_Flaw(path=(key,), message=f"must be tables, [{key}.NAME]"))
        return
    for name, table in entries.items():
        if isinstance(table, dict):
            yield name, table
        else:
            flaws.append(_Flaw(path=(key, name), message=f"must be a table, [{key}.NAME]"))


def _unknown(table: Table, known: tuple[str, ...], path: tuple[str, ...]) -> Iterator[_Flaw]:
    for key in table:
        if key not in known:
            yield _Flaw(path=(*path, key), message="is no key of a kit", near=nearest(key, known))


def _read(
    table: Table,
    path: tuple[str, ...],
    readers: Mapping[str, Callable[[object], Any]],
    flaws: list[_Flaw],
) -> dict[str, Any]:
    """Return what the readers make of a table's keys; what they cannot read is a flaw."""
    flaws.extend(_unknown(table, tuple(readers), path))
    found: dict[str, Any] = {}
    for key, reader in readers.items():
        if key not in table:
            continue
        try:
            found[key] = reader(table[key])
        except _FlawError as error:
            flaws.append(_Flaw(path=(*path, key), message=str(error)))
    return found


def _probe(name: str, table: Table, flaws: list[_Flaw]) -> KitProbe | None:
    readers = {"R": _positive("ohm"), "C": _positive("F"), "calibration_due": _date}
    path = ("probe", name)
    found = _read(table, path, readers, flaws)
    flaws.extend(
        _Flaw(path=path, message=f"needs {key}, the probe's load")
        for key in ("R", "C")
        if key not in table
    )
    if not {"R", "C"} <= found.keys():
        return None
    return KitProbe(
        name=name, r_ohm=found["R"], c_f=found["C"], calibration_due=found.get("calibration_due")
    )


def _instrument(
    name: str, table: Table, probes: Mapping[str, KitProbe], flaws: list[_Flaw]
) -> KitInstrument:
    def known_probe(value: object) -> KitProbe:
        if _text(value) not in probes:
            raise _FlawError(f"names no probe of this file; it has {', '.join(probes) or 'none'}")
        return probes[str(value)]

    readers = {
        "resource": _text,
        "dialect": _text,
        "timebase": _share,
        "calibration_due": _date,
        "channels": _channels,
        "probe": known_probe,
    }
    found = _read(table, ("instrument", name), readers, flaws)
    timebase_rel = found.pop("timebase", None)
    return KitInstrument(name=name, timebase_rel=timebase_rel, **found)


def _text(value: object) -> str:
    if not isinstance(value, str) or not value.strip():
        raise _FlawError("must be a text between quotes")
    return value


def _positive(unit: str) -> Callable[[object], float]:
    def reader(value: object) -> float:
        number = _number(value, unit)
        if number <= 0:
            raise _FlawError(f"must be greater than 0, got {value}")
        return number

    return reader


def _number(value: object, unit: str) -> float:
    if isinstance(value, bool) or not isinstance(value, str | int | float):
        raise _FlawError("must be a value with its unit, between quotes")
    try:
        return parse(value, unit)
    except UnitError as error:
        raise _FlawError(error.message) from error


def _share(value: object) -> float:
    number = _number(value, "1")
    if not 0 <= number < 0.5:
        raise _FlawError(f"must be a share from 0 to 50 %, such as 2.5 ppm, got {value}")
    return number


def _date(value: object) -> str:
    if isinstance(value, datetime) or not isinstance(value, date):
        raise _FlawError("must be a date without quotes, such as 2031-03-02")
    return value.isoformat()


def _channels(value: object) -> Mapping[str, str]:
    if not isinstance(value, dict) or not all(isinstance(name, str) for name in value.values()):
        raise _FlawError('must be a table of names, such as { OUT = "CH1" }')
    return MappingProxyType(dict(value))


def _error(flaws: list[_Flaw], text: str, source: str) -> DesignError:
    lines = find_lines(text)
    faults = tuple(
        DesignFault(
            key=".".join(flaw.path),
            message=flaw.message,
            file=source,
            line=line_of(flaw.path, lines),
            near=flaw.near,
        )
        for flaw in flaws
    )
    ordered = tuple(sorted(faults, key=lambda fault: fault.line or 0))
    count = "one fault" if len(ordered) == 1 else f"{len(ordered)} faults"
    return DesignError(f"{source or 'the kit'} has {count}", hint=_HINT, faults=ordered, code=_CODE)
