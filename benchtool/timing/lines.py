"""Lines in the intervals: mains and ripple, seen through when exactly the edges come."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.quantity import Contribution, Measured
from benchtool.model.regularity import Line, LineSource
from benchtool.model.timing import Edges, Intervals
from benchtool.timing.periodogram import (
    Comb,
    Series,
    amplitude,
    joint_log_chance,
    log_chance,
    make_comb,
    make_series,
    power,
    power_on,
    without,
)
from benchtool.uncertainty import combine

CHANCE = 1e-3
"""Chance of a false alarm up to which a line is taken as seen."""

MAINS_HZ = (50.0, 60.0)
"""Mains frequencies (common practice); rectified mains has twice those and their multiples."""

_MULTIPLES = (1, 2, 3, 4, 6)
_MAINS_REL = 0.005  # half-width of what the mains may be off, with the timebase: common practice
_WORK = 2e7  # sines that are computed at most for a search without a hint
_MOST_LINES = 3
_MINOR = 0.05  # of the strongest line: what is weaker may be its own distortion
_SAME = 0.85  # of the share of the best: a frequency that does so well cannot be told from it
_MOST_ALIASES = 400
_FEW = 5  # of them that are named
_TICKS = 4.0  # grid steps in a cycle below which a frequency cannot be seen


@frozen_record(eq=False)
class _Searched:
    """Rows of frequencies, how many of them are independent, and the highest that can be seen."""

    combs: tuple[Comb, ...]
    n_independent: float
    highest_hz: float


def find_lines(
    intervals: Intervals,
    edges: Edges,
    *,
    ripple_hz: Measured | None = None,
    most_hz: float | None = None,
    timebase_rel: float = 50e-6,
) -> tuple[Line, ...]:
    """Return the frequencies that the intervals follow.

    A ripple moves the threshold at which an interval ends, so that its length goes with the phase
    of the ripple at its end. Those ends do not come evenly; a frequency far above their mean rate
    is therefore seen, and as itself.

    Args:
        intervals: Intervals of the trace.
        edges: The edges they were made of.
        ripple_hz: Ripple of the supply where that was recorded.
        most_hz: Highest frequency of the search besides the mains; None for ten times the mean
            rate, as far as the work allows.
        timebase_rel: Half-width of the timebase error, relative.

    References:
        Lomb 1976, Scargle 1982: the periodogram at the exact uneven times. The false alarm is
        1 - (1 - p)^M, M being the independent frequencies in what was searched.
    """
    series = [item for item in _series(intervals) if item.is_enough]
    if not series:
        return ()
    span_s = max(float(np.ptp(item.times_s)) for item in series)
    searched = _searched(series, span_s, edges, ripple_hz, most_hz)
    found: list[Line] = []
    for _ in range(_MOST_LINES):
        line = _best(series, searched, span_s, ripple_hz, timebase_rel)
        if line is None or (found and line.amplitude_s < _MINOR * found[0].amplitude_s):
            break
        found.append(line)
        series = [without(item, line.frequency.value) for item in series]
    return tuple(found)


def _series(intervals: Intervals) -> tuple[Series, Series]:
    """Return high and low times, each at its end."""
    return (
        make_series(intervals.high_starts_s + intervals.high_s, intervals.high_s),
        make_series(intervals.low_starts_s + intervals.low_s, intervals.low_s),
    )


def _highest(edges: Edges, span_s: float) -> float:
    """Return the highest frequency that the resolution of the edges lets through."""
    u_s = float(np.sqrt(np.mean(edges.u_s**2))) if edges.u_s.size else 0.0
    step_s = edges.grid_s if edges.resolved else edges.step_s
    finest_s = max(_TICKS * step_s, 6 * u_s)
    return 1 / finest_s if finest_s > 0 else 1e6 / span_s


def _searched(
    series: Sequence[Series],
    span_s: float,
    edges: Edges,
    ripple_hz: Measured | None,
    most_hz: float | None,
) -> _Searched:
    """Return where lines are looked for: up to a limit, and around the multiples of the mains."""
    n = sum(item.values.size for item in series)
    rate_hz = max(item.values.size for item in series) / span_s
    highest_hz = _highest(edges, span_s)
    work_hz = _WORK / n / (5 * span_s)
    top_hz = min(most_hz or 10 * rate_hz, highest_hz, work_hz)
    ranges = [(1.5 / span_s, max(top_hz, 2 / span_s))]
    windows = [m * f for f in MAINS_HZ for m in _MULTIPLES]
    widths = [_MAINS_REL * f for f in windows]
    if ripple_hz is not None:
        windows.append(ripple_hz.value)
        widths.append(3 * ripple_hz.u + 1 / span_s)
    room_hz = work_hz / len(windows)
    for centre_hz, width_hz in zip(windows, widths, strict=True):
        half_hz = min(width_hz, room_hz / 2)
        if ranges[0][1] < centre_hz + half_hz and centre_hz < highest_hz:
            ranges.append((max(ranges[0][1], centre_hz - half_hz), centre_hz + half_hz))
    return _Searched(
        combs=tuple(make_comb(low, high, span_s) for low, high in ranges),
        n_independent=sum((high - low) * span_s + 1 for low, high in ranges),
        highest_hz=highest_hz,
    )


def _logs(series: Sequence[Series], at_hz: FloatArray) -> FloatArray:
    return joint_log_chance([log_chance(power(item, at_hz), item.n_free) for item in series])


def _best(
    series: Sequence[Series],
    searched: _Searched,
    span_s: float,
    ripple_hz: Measured | None,
    timebase_rel: float,
) -> Line | None:
    at_hz, log = _refined(series, _nearest(series, searched), span_s)
    false_alarm = -math.expm1(searched.n_independent * math.log1p(-min(math.exp(log), 1 - 1e-16)))
    if false_alarm > CHANCE:
        return None
    alike = _aliases(series, at_hz, searched.highest_hz, span_s)
    sources = [_source(hz, span_s, ripple_hz) for hz in alike]
    # Where even edges leave a choice: what is known to be there, else the lowest.
    known = [index for index, (source, _) in enumerate(sources) if source == "supply"]
    named = known or [index for index, (source, _) in enumerate(sources) if source == "mains"]
    chosen = named[0] if len(named) == 1 else 0
    others = [hz for hz in alike if hz != alike[chosen]]
    return Line(
        frequency=_frequency(series, alike[chosen], span_s, timebase_rel),
        amplitude_s=max(amplitude(item, alike[chosen]) for item in series),
        false_alarm=false_alarm,
        source=sources[chosen][0] if len(named) == 1 or len(alike) == 1 else "unknown",
        of_hz=sources[chosen][1] if len(named) == 1 or len(alike) == 1 else None,
        others_hz=tuple(others[:_FEW]),
        n_others=len(others),
    )


def _nearest(series: Sequence[Series], searched: _Searched) -> float:
    """Return the best of the frequencies that are searched."""
    best_hz, best = 0.0, math.inf
    for comb in searched.combs:
        logs = joint_log_chance([log_chance(power_on(item, comb), item.n_free) for item in series])
        index = int(np.argmin(logs))
        if logs[index] < best:
            best_hz, best = comb.low_hz + comb.step_hz * index, float(logs[index])
    return best_hz


def _refined(series: Sequence[Series], near_hz: float, span_s: float) -> tuple[float, float]:
    """Return the best frequency near one of the grid, and ln of its chance."""
    fine = near_hz + np.linspace(-0.3, 0.3, 121) / span_s
    fine = fine[fine > 0]
    logs = _logs(series, fine)
    best = int(np.argmin(logs))
    return float(fine[best]), float(logs[best])


def _aliases(
    series: Sequence[Series], at_hz: float, highest_hz: float, span_s: float
) -> list[float]:
    """Return all frequencies that the edges cannot tell from one, itself among them, ascending.

    Edges at an even rate r see f, f + r, r - f, ... alike. The more they scatter, the sooner two
    of these come apart.
    """
    longest = max(series, key=lambda item: item.values.size)
    steps = longest.values.size - 1
    if steps < 1:
        return [at_hz]
    rate_hz = steps / float(np.ptp(longest.times_s))
    most = min(int(highest_hz / rate_hz), _MOST_ALIASES)
    folds = np.arange(-most, most + 1) * rate_hz
    candidates = np.abs(np.concatenate([folds + at_hz, folds - at_hz]))
    candidates = candidates[(candidates > 1 / span_s) & (candidates < highest_hz)]
    if not candidates.size:
        return [at_hz]
    own = sum(float(power(item, np.array([at_hz]))[0]) for item in series)
    shares = np.sum([power(item, candidates) for item in series], axis=0)
    found = {round(float(hz), 9) for hz in candidates[shares >= _SAME * own]}
    near = {hz for hz in found if abs(hz - at_hz) < 1 / span_s}
    return sorted({*(found - near), at_hz})


def _frequency(
    series: Sequence[Series], frequency_hz: float, span_s: float, timebase_rel: float
) -> Measured:
    """Return the frequency with its uncertainty.

    References:
        u = √(6/n)·σ/(π·span·A) (Montgomery and O'Donoghue 1999), A over all rows.
    """
    weight = 0.0
    for item in series:
        share = float(power(item, np.array([frequency_hz]))[0])
        weight += item.values.size * 2 * share / max(1 - share, 1e-12)
    u = math.sqrt(6 / max(weight, 1e-12)) / (math.pi * span_s)
    n = sum(item.values.size for item in series)
    clock = frequency_hz * timebase_rel / math.sqrt(3)
    return combine(
        frequency_hz,
        "Hz",
        [
            Contribution(source="noise", u=u, dof=max(1, n - 5)),
            Contribution(source="timebase", u=-clock, common=True),
        ],
        n=n,
    )


def _source(
    frequency_hz: float, span_s: float, ripple_hz: Measured | None
) -> tuple[LineSource, float | None]:
    if ripple_hz is not None and abs(frequency_hz - ripple_hz.value) < 3 * ripple_hz.u + 1 / span_s:
        return "supply", ripple_hz.value
    for mains_hz in MAINS_HZ:
        multiple = round(frequency_hz / mains_hz)
        if (
            1 <= multiple <= _MULTIPLES[-1]
            and abs(frequency_hz / (multiple * mains_hz) - 1) < _MAINS_REL
        ):
            return "mains", mains_hz
    return "unknown", None
