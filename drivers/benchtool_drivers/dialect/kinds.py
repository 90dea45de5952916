"""The kinds of dialects: each with its keys, its record, and what it demands between them."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from typing import Any

from benchtool.frozen import frozen_record
from benchtool_drivers.dialect.bodies import BODY
from benchtool_drivers.dialect.describing import describe_digitiser
from benchtool_drivers.dialect.records import Dialect, DigitiserKeys
from benchtool_drivers.dialect.rules import find_conflicts
from benchtool_drivers.dialect.tables import Key
from benchtool_drivers.dialect.takers import Flaw


@frozen_record
class Kind:
    """A kind of dialect.

    Attributes:
        keys: Its own top-level keys.
        make: The record that holds them.
        conflicts: Finds what keys that are each right demand of one another.
        describe: Says in plain words what a dialect of the kind does.
    """

    keys: Mapping[str, Key]
    make: Callable[..., Any]
    conflicts: Callable[[Dialect], Iterable[Flaw]]
    describe: Callable[[Dialect], Iterable[tuple[str, str]]]


DIGITISER = Kind(
    keys=BODY,
    make=DigitiserKeys,
    conflicts=lambda dialect: find_conflicts(dialect.body, dialect.channel),
    describe=describe_digitiser,
)
