"""What the reader of a figure should know: how few intervals, whether directions differ."""

from __future__ import annotations

import math

from benchtool.model.quantity import Measured, Notice
from benchtool.model.timing import Intervals
from benchtool.timing.budget import Setting
from benchtool.uncertainty import combine, expanded


def few_notice(setting: Setting) -> tuple[Notice, ...]:
    """Tell that one interval, or two, are all there is of a state."""
    counts = {"high": setting.intervals.high_s, "low": setting.intervals.low_s}
    single = [name for name, values in counts.items() if values.size == 1]
    if single:
        text = (
            f"only one complete {' and one complete '.join(single)} interval: its jitter is "
            f"assumed to be {setting.jitter_rel:.2g} of it"
        )
        return (Notice(code="single-interval", text=text),)
    pairs = [
        f"{name} {values[0]:.6g} s and {values[1]:.6g} s"
        for name, values in counts.items()
        if values.size == 2
    ]
    if pairs:
        text = f"two intervals are all there is: {'; '.join(pairs)}"
        return (Notice(code="two-intervals", text=text),)
    return ()


def direction_notice(
    intervals: Intervals, period: Measured | None, other: Measured | None
) -> tuple[Notice, ...]:
    """Tell whether the period depends on the direction of the edges, beyond what is uncertain.

    Args:
        intervals: Intervals of the trace.
        period: Period from the edges that begin a cycle.
        other: Period from the edges of the other direction.
    """
    if period is None or other is None or min(period.n, other.n) < 3:
        return ()
    apart = abs(period.value - other.value)
    if apart <= math.hypot(*(expanded(_own(item)) for item in (period, other))):
        return ()
    rising, falling = (period, other) if intervals.active == "high" else (other, period)
    text = (
        f"the period is {rising.value:.6g} s between rising and {falling.value:.6g} s between "
        "falling edges, further apart than their uncertainties"
    )
    return (Notice(code="directions-differ", text=text),)


def _own(item: Measured) -> Measured:
    """Return the figure without the errors that both directions share."""
    return combine(item.value, item.unit, [term for term in item.budget if not term.common])
