"""What a digitiser's dialect does, in plain words."""

from __future__ import annotations

from collections.abc import Iterator

from benchtool_drivers.dialect.records import Dialect, DigitiserKeys, Lookup
from benchtool_drivers.dialect.vocabulary import X_FORMS, Y_FORMS


def describe_digitiser(dialect: Dialect) -> Iterator[tuple[str, str]]:
    """Yield what a dialect of kind "digitiser" does."""
    body: DigitiserKeys = dialect.body
    wait = body.acquire.wait
    yield "takes a record by", ", ".join(body.acquire.arm) or "nothing: it reads what there is"
    yield "waits by", f"{wait.by} {wait.query}".strip()
    fields = ", ".join(sorted(body.preamble.fields)) or "none"
    yield "figures from", f"{body.preamble.kind}: {fields}"
    total = f", length by {body.chunk.total}" if body.chunk.total else ""
    yield "samples by", f"{body.data.query}, {body.data.wrap}, pieces {body.chunk.by}{total}"
    yield "samples are", _shown(body.data.dtype)
    yield "volts", Y_FORMS[body.scale.y][2]
    yield "seconds", X_FORMS[body.scale.x][2]


def _shown(lookup: str | Lookup) -> str:
    if isinstance(lookup, str):
        return lookup
    words = ", ".join(f"{word} {meaning}" for word, meaning in lookup.map.items())
    return f"by {'+'.join(lookup.names)}: {words}"
