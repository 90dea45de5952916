"""Lines too wide or too long to be rows of a capture."""

from __future__ import annotations

from benchtool.errors import MalformedCaptureError

MOST_FIELDS = 1024
"""Cells of a row; a capture has a few channels, a table of thousands of columns is none."""
_LONGEST = 1 << 16
_TOLD = 1 << 10
_MARKS = (",", ";", "\t", "|")


def without_wide(lines: list[str], source: str) -> list[str]:
    """Return the lines without those that have too many cells, and the beginning of long ones.

    Args:
        lines: The first lines of a file.
        source: File name, for the error.

    Raises:
        MalformedCaptureError: If nothing else is left (``too-many-columns``).
    """
    if max(map(len, lines), default=0) <= MOST_FIELDS:
        return lines  # too short to hold that many: nearly every file, told without a look inside
    kept = ["" if _is_wide(line) else line for line in lines]
    kept = [line if len(line) <= _LONGEST else line[:_TOLD] for line in kept]
    widest = max((_n_fields(line) for line in lines), default=0)
    if widest <= MOST_FIELDS or sum(bool(line.strip()) for line in kept) > 1:
        return kept
    raise MalformedCaptureError(
        f"{source} has rows of {widest} cells; at most {MOST_FIELDS} can be columns of a capture",
        hint="Export the channels of interest alone, one row a time.",
        path=source,
        code="too-many-columns",
    )


def _n_fields(line: str) -> int:
    return 1 + max(line.count(mark) for mark in _MARKS)


def _is_wide(line: str) -> bool:
    if len(line) <= MOST_FIELDS:
        return False
    return _n_fields(line) > MOST_FIELDS or len(line.split(None, MOST_FIELDS)) > MOST_FIELDS
