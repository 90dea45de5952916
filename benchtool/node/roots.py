"""Where a monotone function is zero."""

from __future__ import annotations

from collections.abc import Callable

_HALVINGS = 60


def find_root(left: Callable[[float], float], low: float, high: float) -> float | None:
    """Return where a monotone function is zero, None where it is not between its ends."""
    at_low, at_high = left(low), left(high)
    if not at_low * at_high < 0:
        return None
    for _ in range(_HALVINGS):
        middle = (low + high) / 2
        now = left(middle)
        if now * at_low > 0:
            low = middle
        else:
            high = middle
    return (low + high) / 2
