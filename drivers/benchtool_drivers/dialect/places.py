"""Where dialects lie: those that came with the program, and the user's own."""

from __future__ import annotations

import os
from collections.abc import Iterable
from pathlib import Path

from benchtool.designs.vocabulary import nearest
from benchtool.errors import BenchtoolError, DesignError, UsageError
from benchtool.folder import user_folder
from benchtool.frozen import frozen_record
from benchtool_drivers.dialect.loading import load_dialect
from benchtool_drivers.dialect.records import Dialect

BUNDLED = Path(__file__).parent.parent / "dialects"


@frozen_record
class Known:
    """The dialects there are, by name, and the user's files that hold none.

    Attributes:
        dialects: A user's own hides the bundled one of its name.
        faulty: Files of the user's folder with a fault, each with its error.
    """

    dialects: dict[str, Dialect]
    faulty: tuple[BenchtoolError, ...] = ()


def known_dialects(kind: str | None = None) -> Known:
    """Return all dialects, or those of one kind.

    A faulty file of the user's is left out and told of, so that one slip does not hide the rest.
    """
    found = {}
    for path in sorted(BUNDLED.glob("*.toml")):
        dialect = load_dialect(path, source=f"bundled:{path.name}")
        found[dialect.name] = dialect
    folder = user_folder()
    faulty: list[BenchtoolError] = []
    for path in sorted((folder / "dialects").glob("*.toml")) if folder else ():
        try:
            dialect = load_dialect(path)
        except BenchtoolError as error:
            faulty.append(error)
        else:
            found[dialect.name] = dialect
    wanted = {name: item for name, item in found.items() if kind in (None, item.kind)}
    return Known(dialects=wanted, faulty=tuple(faulty))


def find_dialect(wanted: str) -> Dialect:
    """Return the dialect of a name, or in a file.

    Raises:
        UsageError: If there is none (``no-such-dialect``).
        DesignError: If its file has faults (``dialect``).
    """
    if wanted.endswith(".toml") or os.sep in wanted:
        return load_dialect(Path(wanted))
    known = known_dialects()
    if wanted in known.dialects:
        return known.dialects[wanted]
    for error in known.faulty:
        if isinstance(error, DesignError) and any(
            Path(fault.file).stem == wanted for fault in error.faults
        ):
            raise error
    raise UsageError(
        f"there is no dialect {wanted!r}",
        hint=_advice(wanted, known.dialects),
        code="no-such-dialect",
    )


def _advice(wanted: str, known: Iterable[str]) -> str:
    names = sorted(known)
    near = nearest(wanted, names)
    meant = f"Did you mean {near}? " if near else ""
    return f"{meant}There are {', '.join(names)}; or give the name of a file ending in .toml."
