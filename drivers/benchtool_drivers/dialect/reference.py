"""What the keys of a dialect file mean, and what a dialect does, in rows to print."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from importlib import import_module

from benchtool.frozen import frozen_record
from benchtool_drivers.dialect.acquisitions import WAIT
from benchtool_drivers.dialect.keys import CHANNELS, KEPT, LINK, PROBE, QUESTION, SETUP
from benchtool_drivers.dialect.loading import KINDS, common_keys
from benchtool_drivers.dialect.records import Dialect
from benchtool_drivers.dialect.tables import NEEDED, Forms, Key, Table
from benchtool_drivers.dialect.vocabulary import FIELD_UNITS, FIELDS, X_FORMS, Y_FORMS


@frozen_record
class KeyRow:
    """A key: the table it stands in, its meaning, its default and an example."""

    table: str
    key: str
    meaning: str
    default: str
    example: str


_INNER = {
    "link": LINK,
    "probe": PROBE,
    "channel": CHANNELS,
    "setup": SETUP,
}


def key_rows() -> Iterator[KeyRow]:
    """Yield every key of dialect files, table by table, then the words that stand for fields."""
    yield from _rows("", common_keys())
    kinds = " or ".join(f'"{kind}"' for kind in KINDS)
    yield KeyRow(table="", key="kind", meaning="what it is for", default="needed", example=kinds)
    for name, table in _INNER.items():
        yield from _rows(f"[{name}]", table.keys)
    yield from _rows("a question", QUESTION.keys)
    yield from _rows("keep", KEPT.keys)
    for kind, place in KINDS.items():
        module, _, name = place.partition(":")
        keys = getattr(import_module(module), name).keys
        yield from _rows(f'of kind = "{kind}"', keys)
        for table, key in keys.items():
            yield from _below(f"[{table}]", key.take)
    yield from _below("wait in [acquire]", WAIT)
    yield from _words()


def _below(name: str, taker: object) -> Iterator[KeyRow]:
    if isinstance(taker, Table):
        yield from _rows(name, taker.keys)
    if isinstance(taker, Forms):
        for word, table in taker.forms.items():
            yield from _rows(f'{name} {taker.tag} = "{word}"', table.keys)


def _rows(table: str, keys: Mapping[str, Key]) -> Iterator[KeyRow]:
    for name, key in keys.items():
        plain = isinstance(key.default, str | int | float | bool)
        needed = "needed" if key.default is NEEDED else ""
        yield KeyRow(
            table=table,
            key=name,
            meaning=key.meaning,
            default=needed or (repr(key.default) if plain else "none"),
            example=key.example,
        )


def _words() -> Iterator[KeyRow]:
    for name, meaning in FIELDS.items():
        yield KeyRow(table="fields", key=name, meaning=meaning, default="", example="")
    units = ", ".join(FIELD_UNITS)
    yield KeyRow(table="fields", key="units", meaning=units, default="", example="")
    for axis, forms in (("y", Y_FORMS), ("x", X_FORMS)):
        for name, (_, _, formula) in forms.items():
            yield KeyRow(
                table=f"{axis} in [scale]", key=name, meaning=formula, default="", example=""
            )


def describe(dialect: Dialect) -> Iterator[tuple[str, str]]:
    """Yield what a dialect does, in plain words."""
    yield "name", dialect.name
    yield "basis", dialect.basis
    yield "recognised by", ", ".join(item.query for item in dialect.probe.ask) or "--dialect"
    yield "channels", ", ".join(dialect.channel.names)
    module, _, name = KINDS[dialect.kind].partition(":")
    yield from getattr(import_module(module), name).describe(dialect)
    yield "puts back", ", ".join(item.set for item in dialect.setup.keep) or "nothing"
