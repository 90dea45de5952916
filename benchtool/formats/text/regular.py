"""Blocks whose rows all have the same fields: the wanted cells, for a bulk conversion."""

from __future__ import annotations

import numpy as np

from benchtool.model.arrays import NDArray

_NUMERIC = b"0123456789+-.eE \t\n"
_NEWLINE = 10


def wanted_cells(
    text: bytes, mark: bytes, n_fields: int, fields: tuple[int, ...], n_rows: int
) -> bytes | None:
    """Return the wanted cells of a regular block, blanks between; None where it is irregular.

    Each wanted cell is checked to hold exactly one token.
    """
    buffer = np.frombuffer(text, np.uint8)
    if mark == b" ":
        return _only_blanks(text, buffer, n_fields, fields, n_rows)
    ends = buffer == _NEWLINE
    if mark:
        ends |= buffer == mark[0]
    places = np.flatnonzero(ends)
    if places.size != n_rows * n_fields or (buffer[places[n_fields - 1 :: n_fields]] != 10).any():
        return None
    if len(fields) < n_fields:
        buffer = _blanked(buffer, ends, n_fields, fields)
        text = buffer.tobytes()
    if text.translate(None, _NUMERIC + mark):
        return None
    token = (buffer > 32) & ~ends
    starts = np.flatnonzero(token[1:] > token[:-1]) + 1
    if token[0]:
        starts = np.concatenate([[0], starts])
    if starts.size != n_rows * len(fields):
        return None
    cell = np.add.outer(np.arange(n_rows) * n_fields, np.array(fields)).ravel()
    before = np.concatenate([[-1], places])[cell]
    if not ((starts < places[cell]) & (starts > before)).all():
        return None
    return text.replace(mark, b" ") if mark else text


def _blanked(
    buffer: NDArray[np.uint8], ends: NDArray[np.bool_], n_fields: int, fields: tuple[int, ...]
) -> NDArray[np.uint8]:
    """Blank out the cells of the fields not wanted."""
    wanted = np.zeros(n_fields, bool)
    wanted[list(fields)] = True
    field = (np.cumsum(ends) - ends) % n_fields
    return np.where(wanted[field] | ends, buffer, np.uint8(32))


def _only_blanks(
    text: bytes, buffer: NDArray[np.uint8], n_fields: int, fields: tuple[int, ...], n_rows: int
) -> bytes | None:
    if len(fields) < n_fields or text.translate(None, _NUMERIC):
        return None
    token = buffer > 32
    starts = np.flatnonzero(token[1:] > token[:-1]) + 1
    if token[0]:
        starts = np.concatenate([[0], starts])
    lines = np.searchsorted(np.flatnonzero(buffer == _NEWLINE), starts)
    if starts.size != n_rows * n_fields:
        return None
    return text if (lines.reshape(n_rows, n_fields) == np.arange(n_rows)[:, None]).all() else None
