"""What would settle an undecided check: how many more periods, or what else."""

from __future__ import annotations

import math
from dataclasses import replace

from benchtool.judge.rules import guard_band
from benchtool.model.design import Rule
from benchtool.model.quantity import Contribution, Measured
from benchtool.uncertainty import combine

MOST_PERIODS = 1_000_000
"""More than this is no advice."""

REPEATABLE = frozenset({"scatter", "assumed jitter", "edge noise", "grid"})
"""Sources of the mean of n intervals that fall with n; all others stay, however many there are."""

_BATCH_DOF = 11.0  # a long record's scatter comes from twelve batches: no more is counted on


def periods_to_settle(measured: Measured, margin: float, rule: Rule) -> int | None:
    """Return how many more periods would bring the guard band down to the margin.

    The estimate is taken to stay where it is; what repetition reduces falls with 1/√n, and its
    degrees of freedom grow with n as far as those of a long record; all else stays.

    Args:
        measured: The value with its budget.
        margin: Distance to the limit that decides, of either sign, in the value's unit.
        rule: The decision rule.

    Returns:
        The least number of further periods, or None where none would do or it exceeds
        ``MOST_PERIODS``.

    References:
        JCGM 100:2008, 4.2.3 (standard deviation of the mean) and G.4.1.
    """
    repeatable = any(term.source in REPEATABLE for term in measured.budget)
    if not repeatable or not _settles(measured, MOST_PERIODS, margin, rule):
        return None
    low, high = measured.n, MOST_PERIODS
    while high - low > 1:
        middle = (low + high) // 2
        low, high = (low, middle) if _settles(measured, middle, margin, rule) else (middle, high)
    return high - measured.n


def _settles(measured: Measured, n: int, margin: float, rule: Rule) -> bool:
    budget = [_repeated(term, n / measured.n) for term in measured.budget]
    expected = combine(measured.value, measured.unit, budget, n=n)
    return guard_band(expected.u, expected.dof, rule) <= abs(margin)


def _repeated(term: Contribution, times: float) -> Contribution:
    if term.source not in REPEATABLE:
        return term
    grown = min((term.dof + 1) * times - 1, _BATCH_DOF)
    return replace(term, u=term.u / math.sqrt(times), dof=max(term.dof, grown))


def dominant_source(measured: Measured) -> str | None:
    """Return the source of the largest contribution, None where the budget is empty."""
    largest = max(measured.budget, key=lambda term: abs(term.u), default=None)
    return largest.source if largest else None
