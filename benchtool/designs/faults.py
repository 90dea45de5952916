"""What is wrong with a design file, in plain words: from the validator's errors to faults."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from typing import TYPE_CHECKING, Any

from benchtool.designs.lines import Path, find_lines, line_of
from benchtool.designs.notation import key_text, value_text
from benchtool.designs.vocabulary import TOPOLOGY_PARTS, listed, nearest
from benchtool.errors import DesignError, DesignFault
from benchtool.frozen import frozen_record

if TYPE_CHECKING:
    from pydantic import ValidationError
    from pydantic_core import ErrorDetails

_PARTS = {part for parts in TOPOLOGY_PARTS.values() for part in parts}


@frozen_record
class Flaw:
    """A fault before its line is known.

    Attributes:
        path: Keys from the root.
        message: What is wrong and what was expected.
        near: Nearest known key or word.
        missing: The key that is not there, where that is the flaw.
    """

    path: Path
    message: str
    near: str | None = None
    missing: str | None = None


def design_error(flaws: Iterable[Flaw], text: str, *, source: str) -> DesignError:
    """Return the error that carries every flaw with its line, in the order of the file."""
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
    place = f"{source or 'the design'}{f', line {first.line}' if first.line else ''}"
    message = (
        f"{place}: {first.key}: {first.message}"
        if len(faults) == 1
        else f"{source or 'the design'} has {len(faults)} faults"
    )
    return DesignError(
        message,
        hint="correct the keys named; `benchtool design schema` prints the structure for editors",
        faults=tuple(faults),
    )


def find_flaws(error: ValidationError, document: Mapping[str, Any]) -> list[Flaw]:
    """Return the flaws that the validator found."""
    return [_flaw(detail, document) for detail in error.errors(include_url=False)]


def without_echoes(flaws: Iterable[Flaw]) -> list[Flaw]:
    """Return the flaws with each misspelt or misplaced key once.

    Such a key is unknown where it stands and missing where it should stand; the latter goes.
    """
    found = list(flaws)
    meant: set[str | None] = {flaw.near for flaw in found if flaw.near}
    meant |= {key_text((*flaw.path[:-1], flaw.near)) for flaw in found if flaw.near}
    return list(_joined(flaw for flaw in found if not _is_echo(flaw, meant)))


def _is_echo(flaw: Flaw, meant: set[str | None]) -> bool:
    return flaw.missing is not None and key_text(flaw.path) in meant


def _joined(flaws: Iterable[Flaw]) -> Iterator[Flaw]:
    """Join what is missing from the same short form into one flaw."""
    by_path: dict[Path, list[Flaw]] = {}
    for flaw in flaws:
        by_path.setdefault(flaw.path, []).append(flaw)
    for path, group in by_path.items():
        names = [flaw.missing for flaw in group if flaw.missing]
        if len(names) < 2:
            yield from group
            continue
        yield Flaw(path=path, message=f"needs a table with {listed(names)}")
        yield from (flaw for flaw in group if not flaw.missing)


def _flaw(detail: ErrorDetails, document: Mapping[str, Any]) -> Flaw:
    path = _without_tags(detail["loc"])
    shown = _stated_part(path, document, missing=detail["type"] == "missing")
    message, near = _explain(detail, path, document)
    missing = str(path[-1]) if detail["type"] == "missing" else None
    return Flaw(path=shown, message=message, near=near, missing=missing)


def _without_tags(loc: Path) -> Path:
    """Leave out the name of the stage's table that the validator puts after the stage's own."""
    return (*loc[:2], *loc[3:]) if loc[:1] == ("stage",) else loc


def _stated_part(path: Path, document: Mapping[str, Any], *, missing: bool) -> Path:
    """Cut a path where the file has a text instead of the table that it stands for."""
    node: object = document
    for n, step in enumerate(path):
        if isinstance(node, dict) and (step in node or (missing and n == len(path) - 1)):
            node = node.get(step)
        elif isinstance(node, list) and isinstance(step, int):
            node = node[step]
        else:
            return path[:n]
    return path


def _explain(
    detail: ErrorDetails, path: Path, document: Mapping[str, Any]
) -> tuple[str, str | None]:
    """Return the message in plain words and the nearest known word."""
    kind = detail["type"]
    if kind == "extra_forbidden":
        return _explain_unknown(path, document)
    if kind == "missing":
        return _explain_missing(path, document), None
    if kind == "literal_error":
        return _explain_choice(detail, path)
    if kind == "value_error":
        return str(detail["ctx"]["error"]), None
    if kind.startswith("union_tag") or kind in ("model_type", "model_attributes_type", "dict_type"):
        return f"must be a table, not {_shown(detail['input'])}", None
    shown = _shown(detail["input"])
    return _PLAIN.get(kind, detail["msg"]).format(shown=shown, **detail.get("ctx", {})), None


_PLAIN = {
    "string_type": '{shown} must be a text between quotes, such as "OUT"',
    "string_too_short": "must not be empty",
    "int_type": "{shown} must be a whole number, such as 1",
    "float_type": "{shown} must be a number, such as 1.0",
    "finite_number": "{shown} must be a finite number",
    "list_type": '{shown} must be a list, such as ["t_high", "period"]',
    "too_short": "must not be empty",
    "greater_than_equal": "{shown} must be at least {ge:g}",
}


def _explain_choice(detail: ErrorDetails, path: Path) -> tuple[str, str | None]:
    from benchtool.designs.schema import STAGES

    expected = str(detail["ctx"]["expected"]).replace(" or ", ", ")
    known = [word.strip("'") for word in expected.split(", ")]
    if path[:1] == ("stage",) and path[2:] == ("topology",):
        known = list(STAGES)
    given = detail["input"]
    near = nearest(given, known) if isinstance(given, str) else None
    if path == ("schema",):
        return f"{_shown(given)} is not known; this program reads schema = 1", None
    return f"{_shown(given)} is not known; it must be {listed(known, 'or')}", near


def _explain_missing(path: Path, document: Mapping[str, Any]) -> str:
    from benchtool.designs.schema import DesignTable, table_at

    name = str(path[-1])
    fields = (table_at(path[:-1], document) or DesignTable).model_fields.items()
    info = next(info for field, info in fields if name in (field, info.alias))
    example = (info.examples or [""])[0]
    if name == "stage":
        return f"is missing: {info.description}, each a table such as [stage.{next(iter(example))}]"
    return f"is missing: {info.description}, such as {name} = {value_text(example)}"


def _explain_unknown(path: Path, document: Mapping[str, Any]) -> tuple[str, str | None]:
    from benchtool.designs.schema import DesignTable, homes_of, known_keys, table_at, takers_of

    name = str(path[-1])
    known = known_keys(table_at(path[:-1], document) or DesignTable)
    near = nearest(name, known)
    topology = _topology(path, document)
    if name in _PARTS and path[:1] == ("stage",) and len(path) == 3:
        parts = listed(TOPOLOGY_PARTS[topology])
        return f"{topology} has no part {name}; its parts are {parts}", near
    takers = takers_of(name) if len(path) == 3 and path[0] == "stage" else ()
    if takers and near is None:
        return f"{topology} takes no {name}; it belongs to {listed(takers)}", None
    homes = [_home(home, path, document) for home in homes_of(name, topology)]
    if near is None and homes:
        return f"does not belong here but in {listed(homes, 'or')}", f"{homes[0]}.{name}"
    return f"is no key known here; known are {listed(sorted(known))}", near


def _topology(path: Path, document: Mapping[str, Any]) -> str:
    """Return the topology of the stage in which a key stands, or of the first stage."""
    from benchtool.designs.schema import stage_topology

    stages = document.get("stage")
    if not (isinstance(stages, dict) and stages):
        return "astable"
    return stage_topology(stages[path[1]] if path[0] == "stage" else next(iter(stages.values())))


def _home(home: Path, path: Path, document: Mapping[str, Any]) -> str:
    """Return a table's key with the name of the stage meant put in."""
    if home[:1] != ("stage",):
        return key_text(home)
    stages = document.get("stage")
    name = path[1] if path[0] == "stage" else next(iter(stages), "NAME") if stages else "NAME"
    return key_text(("stage", name, *home[1:]))


def _shown(value: object) -> str:
    words = {bool: str(value).lower(), list: "a list", dict: "a table"}
    text = words.get(type(value)) or (repr(value) if isinstance(value, str) else f"{value}")
    return text if len(text) <= 60 else text[:57] + "..."
