"""Columns of text beside the numbers: the name of a board or of a channel in every row."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence

import numpy as np

from benchtool.formats.text.cells import Kind
from benchtool.model.arrays import FloatArray

_LEAST_ROWS = 4
_MOST_LABELS = 32
_SHARE = 0.6  # of the lines must have a text in the same place

Kinds = tuple[Kind, ...]


def with_labels(cells: list[list[str]], kinds: list[Kinds]) -> list[Kinds]:
    """Return the kinds with the text of label columns marked as labels.

    A label stands in most rows and is one of few; free text is none, and rows of it are no data.

    Args:
        cells: Cells of the lines.
        kinds: Their kinds.
    """
    widths = Counter(len(row) for row in kinds if "T" in row and _holds_two(row))
    if not widths:
        return kinds
    width, n_rows = widths.most_common(1)[0]
    n_lines = sum(any(cell for cell in row) for row in cells)
    if width < 2 or n_rows < max(_LEAST_ROWS, _SHARE * n_lines):
        return kinds
    told = {i: _labels(cells, kinds, i, width, n_rows) for i in range(width)}
    return [
        tuple(
            "L" if kind == "T" and cell in told[i] else kind
            for i, (kind, cell) in enumerate(zip(row, line, strict=True))
        )
        if len(row) == width
        else row
        for row, line in zip(kinds, cells, strict=True)
    ]


def _holds_two(row: Kinds) -> bool:
    """Say whether a row has a time and a value beside its text."""
    return ("N" in row or "S" in row) and sum(kind in "NSWH" for kind in row) > 1


def _labels(
    cells: list[list[str]], kinds: list[Kinds], place: int, width: int, n_rows: int
) -> frozenset[str]:
    """Return the labels of a column; none where its text is free."""
    texts = Counter(
        line[place]
        for row, line in zip(kinds, cells, strict=True)
        if len(row) == width and row[place] == "T" and line[place][0].isalpha()
    )
    often = {text: n for text, n in texts.items() if n > 1}
    few = len(often) <= min(_MOST_LABELS, n_rows / 2)
    return frozenset(often) if few and sum(often.values()) >= 0.8 * n_rows else frozenset()


def codes_of(cells: Sequence[str]) -> FloatArray:
    """Return a number for each label, the same for the same label; NaN where there is none."""
    from zlib import crc32

    return np.array([float(crc32(cell.encode())) if cell else np.nan for cell in cells])
