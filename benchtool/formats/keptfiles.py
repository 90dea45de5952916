"""The files that keep structures, and which structure a capture is read as."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

from benchtool.errors import AmbiguousStructureError, UsageError
from benchtool.formats.content import Content, input_error
from benchtool.formats.kept import NONE, Kept, applies, read_kept
from benchtool.formats.keptplaces import places
from benchtool.formats.text.encoding import find_encoding

_MOST_BYTES = 1 << 16


def choose_kept(content: Content, wanted: str | None) -> Kept | None:
    """Return the kept structure that a capture is to be read as.

    Args:
        content: The capture.
        wanted: The name that the user gives; None takes the one that applies by itself.

    Raises:
        UsageError: If a file of structures has a fault, or none has the name
            (``bad-kept-structure``, ``no-such-structure``).
        AmbiguousStructureError: If two apply (``several-structures``).
    """
    if wanted is not None and wanted.casefold() == NONE:
        return None
    known = _all_kept(content.source)
    if wanted is not None:
        return _named(wanted, known, content.source)
    if not known:
        return None
    name, lines = Path(content.source).name, head_lines(content)
    found = [kept for kept in known.values() if applies(kept, name, lines)]
    if len(found) > 1:
        names = " or ".join(f"--structure {kept.name}" for kept in found)
        raise AmbiguousStructureError(
            f"{content.source} matches several kept structures: "
            + ", ".join(f"{kept.name} in {kept.file}" for kept in found),
            hint=f"Say which with {names}, or --structure none.",
            code="several-structures",
        )
    return found[0] if found else None


def _all_kept(source: str) -> dict[str, Kept]:
    """Return all structures by name; one beside the capture hides the user's own of its name."""
    known: dict[str, Kept] = {}
    for path in places(source):
        known |= {kept.name: kept for kept in read_kept(read_text(path), str(path))}
    return known


def read_text(path: Path) -> str:
    """Return the text of a file of structures.

    Raises:
        InputError: If it cannot be read.
        UsageError: If it is no UTF-8, or larger than any such file (``bad-kept-structure``).
    """
    try:
        with path.open("rb") as file:
            data = file.read(_MOST_BYTES + 1)
    except OSError as error:
        raise input_error(error, str(path)) from error
    if len(data) > _MOST_BYTES:
        raise _no_such_file(path, f"is larger than {_MOST_BYTES >> 10} KiB")
    try:
        return data.decode("utf-8-sig").replace("\r\n", "\n")
    except UnicodeDecodeError:
        raise _no_such_file(path, "is not UTF-8") from None


def _no_such_file(path: Path, what: str) -> UsageError:
    return UsageError(
        f"{path} {what}: it keeps no structures",
        hint="Correct or remove it; --structure none reads captures without it.",
        code="bad-kept-structure",
    )


def _named(wanted: str, known: dict[str, Kept], source: str) -> Kept:
    if wanted in known:
        return known[wanted]
    there = f"Kept are: {_listed(known)}." if known else "None is kept yet."
    raise UsageError(
        f"no structure is kept as {wanted!r}, neither beside {source} nor for all folders",
        hint=f"{there} Keep one with: benchtool look FILE --keep NAME.",
        code="no-such-structure",
    )


def _listed(names: Iterable[str]) -> str:
    return ", ".join(sorted(names)[:16])


def head_lines(content: Content) -> list[str]:
    """Return the first lines of a text."""
    head = content.head()
    text = find_encoding(head).decode(head)
    return text.replace("\r", "" if "\n" in text else "\n").split("\n")
