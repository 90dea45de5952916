"""What benchtool can find out about itself: closed forms, and whether U keeps its word."""

from __future__ import annotations

from benchtool.selftest.checks import SelfCheck
from benchtool.selftest.closed_forms import check_closed_forms

__all__ = ["SelfCheck", "check_closed_forms", "run_selftest"]


def run_selftest(*, n_captures: int = 1000) -> tuple[SelfCheck, ...]:
    """Return every line of the self-test.

    Args:
        n_captures: Simulated captures over which coverage is counted, 4 or more.
    """
    from benchtool.selftest.coverage import check_coverage

    return (*check_closed_forms(), *check_coverage(n_captures))
