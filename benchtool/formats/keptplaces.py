"""Where kept structures lie; small, since each reading looks there."""

from __future__ import annotations

from pathlib import Path

from benchtool.folder import user_folder

BESIDE = "benchtool-structures.toml"
"""Name of the file beside the captures."""


def beside(source: str) -> Path | None:
    """Return where structures are kept beside a capture; None for standard input."""
    return None if source == "-" else Path(source).parent / BESIDE


def of_the_user() -> Path | None:
    """Return where a user's own structures are kept; None for a user without a folder."""
    folder = user_folder()
    return folder and folder / "structures.toml"


def places(source: str) -> list[Path]:
    """Return the files that keep structures for a capture, the nearest last."""
    return [path for path in (of_the_user(), beside(source)) if path is not None and path.is_file()]
