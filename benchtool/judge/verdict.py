"""The worst of several verdicts: of checks for a stage, of stages for a board."""

from __future__ import annotations

from collections.abc import Iterable

from benchtool.model.judgement import WORST_FIRST, VerdictName


def worst(names: Iterable[VerdictName]) -> VerdictName | None:
    """Return the worst verdict, None where there is none at all.

    Example:
        >>> worst(["pass", "undecided", "pass"])
        'undecided'
    """
    return min(names, key=WORST_FIRST.index, default=None)
