"""The intervals themselves, as a table for other programs."""

from __future__ import annotations

from benchtool.model.timing import Intervals


def intervals_csv(intervals: Intervals) -> str:
    """Return one line an interval: kind, when it begins and how long it is, both in seconds.

    Complete intervals come in the order of their beginning; those cut by an end of the record or
    a gap follow with the kind ``cut-high`` or ``cut-low`` and what they last at least.
    """
    groups = (
        ("high", intervals.high_starts_s, intervals.high_s),
        ("low", intervals.low_starts_s, intervals.low_s),
        ("period", intervals.period_starts_s, intervals.period_s),
    )
    rows = sorted(
        (float(start), kind, float(length))
        for kind, starts, lengths in groups
        for start, length in zip(starts, lengths, strict=True)
    )
    lines = [
        "kind,start_s,duration_s",
        *(f"{kind},{start!r},{length!r}" for start, kind, length in rows),
    ]
    lines += [f"cut-{cut.kind},,{cut.at_least_s!r}" for cut in intervals.cut]
    return "\n".join(lines) + "\n"
