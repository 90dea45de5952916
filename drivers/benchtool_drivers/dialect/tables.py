"""Tables of a dialect file: their keys, and how one is taken as a record."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from benchtool.designs.vocabulary import listed, nearest
from benchtool.frozen import frozen_record
from benchtool_drivers.dialect.takers import Spot, Taker, shown

NEEDED: Any = object()
"""In place of a default: the key must be there."""


@frozen_record
class Key:
    """A key of a table.

    Attributes:
        take: Checks its value.
        default: What holds where the key is left out, as the file would say it.
        meaning: What it says, in a line.
        example: A value as the file may have it.
    """

    take: Taker
    default: Any = NEEDED
    meaning: str
    example: str


@frozen_record
class Table:
    """A table with known keys, taken as one record.

    Attributes:
        make: The record.
        keys: Its keys.
        fixed: Fields of the record that the form of the table decides.
    """

    make: Callable[..., Any]
    keys: Mapping[str, Key]
    fixed: Mapping[str, Any]

    def __call__(self, value: Any, spot: Spot) -> Any:
        """Take the table; None where it has a fault."""
        if not isinstance(value, dict):
            spot.wrong(f"must be a table, not {shown(value)}")
            return None
        n_before = len(spot.flaws)
        self._refuse_unknown(value, spot)
        taken = {key: self._taken(key, entry, value, spot) for key, entry in self.keys.items()}
        if len(spot.flaws) > n_before:
            return None
        return self.make(**taken, **self.fixed)

    def _refuse_unknown(self, value: dict[str, Any], spot: Spot) -> None:
        for key in value:
            if key not in self.keys:
                near = nearest(key, self.keys)
                known = "" if near else f"; known are {listed(sorted(self.keys) or ['none'])}"
                spot.at(key).wrong(f"is no key known here{known}", near)

    def _taken(self, key: str, entry: Key, value: dict[str, Any], spot: Spot) -> Any:
        if key in value:
            return entry.take(value[key], spot.at(key))
        if entry.default is not NEEDED:
            return entry.default
        if nearest(key, [given for given in value if given not in self.keys]) is None:
            spot.at(key).wrong(f"is missing: {entry.meaning}, such as {key} = {entry.example}")
        return None


def table(make: Callable[..., Any], fixed: Mapping[str, Any] | None = None, **keys: Key) -> Table:
    """Return a table; a key's name may end in ``_`` where it is a word of the language."""
    return Table(
        make=make, keys={name.rstrip("_"): key for name, key in keys.items()}, fixed=fixed or {}
    )


@frozen_record
class Forms:
    """A table whose keys depend on the word that one of them has."""

    tag: str
    forms: Mapping[str, Table]
    meaning: str

    def __call__(self, value: Any, spot: Spot) -> Any:
        """Take the table in the form that its tag names; None where it has a fault."""
        if not isinstance(value, dict):
            spot.wrong(f"must be a table, not {shown(value)}")
            return None
        word = value.get(self.tag)
        known = listed(map(repr, self.forms), "or")
        if self.tag not in value:
            spot.at(self.tag).wrong(f"is missing: {self.meaning}; one of {known}")
            return None
        if not isinstance(word, str) or word not in self.forms:
            near = nearest(word, self.forms) if isinstance(word, str) else None
            spot.at(self.tag).wrong(f"{shown(word)} is not known; it must be {known}", near)
            return None
        rest = {key: item for key, item in value.items() if key != self.tag}
        return self.forms[word](rest, spot)
