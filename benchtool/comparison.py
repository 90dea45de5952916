"""One measurement against an earlier one of the same board."""

from __future__ import annotations

from benchtool.model.judgement import Change
from benchtool.model.quantity import Contribution, Measured
from benchtool.model.timing import Timing
from benchtool.uncertainty import combine, expanded

_COMPARED = ("t_high", "t_low", "period", "frequency", "duty", "first_high", "delay")


def compare_timing(now: Timing, before: Timing) -> tuple[Change, ...]:
    """Return the relative change of every quantity that both measurements have.

    The two timebases are taken as independent, which is the cautious reading: with one and the
    same instrument part of their error cancels. The IC's thresholds, the parts' tolerances and
    all else that stays on the board cancel in full, since they are in neither time's uncertainty.

    Args:
        now: Timing of today's capture.
        before: Timing of the earlier one.

    Returns:
        A change for each quantity, with unit 1; it is significant where it exceeds its U.
    """
    pairs = [(name, getattr(now, name), getattr(before, name)) for name in _COMPARED]
    return tuple(
        _change(name, after, earlier)
        for name, after, earlier in pairs
        if isinstance(after, Measured) and isinstance(earlier, Measured) and earlier.value
    )


def _change(name: str, now: Measured, before: Measured) -> Change:
    ratio = now.value / before.value
    change = combine(
        ratio - 1,
        "1",
        (
            Contribution(source="this capture", u=now.u / before.value, dof=now.dof),
            Contribution(source="baseline", u=ratio * before.u / before.value, dof=before.dof),
        ),
        n=min(now.n, before.n),
    )
    return Change(
        quantity=name,
        before=before,
        change=change,
        significant=abs(change.value) > expanded(change),
    )
