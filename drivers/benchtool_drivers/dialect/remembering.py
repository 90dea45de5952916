"""Which dialect an instrument was spoken to in before: kept by the text of its identity."""

from __future__ import annotations

import os
import tempfile
import tomllib
from pathlib import Path

from benchtool.designs.notation import value_text
from benchtool.errors import UsageError
from benchtool.folder import user_folder

NAME = "dialects.toml"

_HEAD = "# Which dialect goes with which answer to *IDN?; written by benchtool, yours to edit.\n"


def remembered(identity: str) -> str | None:
    """Return the name of the dialect that an identity was last spoken to in; None if unknown.

    Raises:
        UsageError: If the file that keeps them is damaged (``bad-kept-dialects``).
    """
    return _read().get(identity)


def remember(identity: str, dialect: str) -> None:
    """Keep the dialect of an identity; a folder that cannot be written keeps nothing."""
    folder = user_folder()
    if folder is None or not identity:
        return
    kept = {**_read(), identity: dialect}
    if kept == _read():
        return
    rows = [
        f"\n[[instrument]]\nidentity = {value_text(key)}\ndialect = {value_text(name)}\n"
        for key, name in kept.items()
    ]
    try:
        folder.mkdir(parents=True, exist_ok=True)
        _replace(folder / NAME, _HEAD + "".join(rows))
    except OSError:
        return


def _read() -> dict[str, str]:
    folder = user_folder()
    if folder is None or not (folder / NAME).is_file():
        return {}
    try:
        with (folder / NAME).open("rb") as file:
            rows = tomllib.load(file).get("instrument", [])
        return {str(row["identity"]): str(row["dialect"]) for row in rows}
    except (OSError, ValueError, KeyError, TypeError, AttributeError) as error:
        raise UsageError(
            f"{folder / NAME} cannot be understood: {error}",
            hint="Correct or remove it; it only keeps which dialect goes with which instrument.",
            code="bad-kept-dialects",
        ) from None


def _replace(path: Path, content: str) -> None:
    handle, name = tempfile.mkstemp(dir=path.parent, prefix=f".{path.name}.")
    try:
        with os.fdopen(handle, "w", encoding="utf-8") as file:
            file.write(content)
        Path(name).replace(path)
    except BaseException:
        Path(name).unlink(missing_ok=True)
        raise
