"""Timing figures from the single readings of a counter."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import replace

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.counted import Counted, CountedName, Readings
from benchtool.model.options import JITTER_REL, TIMEBASE_REL
from benchtool.model.quantity import Contribution, Measured, Notice
from benchtool.model.timing import Edges, Intervals, Jitter, Timing
from benchtool.timing.jitter import measure_jitter
from benchtool.timing.scatter import two_pass_sd
from benchtool.uncertainty import combine, propagate
from benchtool.units import format_value

_LEAST = 3  # periods below which there is no jitter to tell
_APART = 3.0  # standard uncertainties
_ROUNDING = 1e-12  # of floats
_UNITS: Mapping[CountedName, str] = {"frequency": "Hz", "duty": "1"}


def timing_of_counted(
    counted: Counted, timebase_rel: float = TIMEBASE_REL, jitter_rel: float = JITTER_REL
) -> tuple[Timing, Jitter | None]:
    """Return the timing figures of a counter's readings, with the jitter where they tell it.

    What was read stands. What was not follows from the rest: the period from the frequency or from
    both widths, a width from the period and the other one, the duty from the widths.

    Args:
        counted: The readings.
        timebase_rel: Half-width of the timebase error, relative (rectangular).
        jitter_rel: Half-width of the jitter assumed of a single reading, relative.

    Returns:
        Times in seconds, frequency in hertz, duty with unit 1. The jitter is None where readings
        are averages over a gate, or where there are too few of the period.

    References:
        JCGM 100:2008, 4.2 (type A, u = s/√n with n - 1 degrees of freedom), 4.3.9 (two rounded
        ends: triangular), G.4 (effective degrees of freedom).
    """
    run = _Run(counted=counted, timebase_rel=timebase_rel, jitter_rel=jitter_rel)
    read = {name: _figure(run, name, item) for name, item in counted.readings.items()}
    jitter = _jitter(counted)
    timing = Timing(
        **_completed(read),
        warnings=(*_few(run), *_averaged(counted), *_apart_in_time(counted), *_disagreement(read)),
    )
    return timing, jitter


@frozen_record(eq=False)
class _Run:
    """What all figures of one run share."""

    counted: Counted
    timebase_rel: float
    jitter_rel: float

    @property
    def period_s(self) -> float | None:
        """The period, roughly: what a gate is compared with."""
        return rough_period_s(self.counted.readings)


def rough_period_s(readings: Mapping[CountedName, Readings]) -> float | None:
    """Return the mean period in seconds, None where nothing tells it."""
    means = {name: float(np.mean(item.values)) for name, item in readings.items()}
    if "period" in means:
        return means["period"]
    if means.get("frequency"):
        return 1 / means["frequency"]
    if "t_high" in means and "t_low" in means:
        return means["t_high"] + means["t_low"]
    return None


def _figure(run: _Run, name: CountedName, item: Readings) -> Measured:
    """Return the mean of readings with its budget."""
    value = float(np.mean(item.values))
    own = _scatter(item.values) if item.values.size > 1 else _assumed(run, name, value)
    terms = [own, _resolution(run, name, item, value), *_timebase(run, name, value)]
    return combine(value, _UNITS.get(name, "s"), terms, n=item.values.size)


def _scatter(values: FloatArray) -> Contribution:
    return Contribution(
        source="scatter",
        u=two_pass_sd(values) / math.sqrt(values.size),
        dof=values.size - 1,
        note=f"s/√n of {values.size} readings",
    )


def _assumed(run: _Run, name: CountedName, value: float) -> Contribution:
    """Return what stands in for scatter where one reading is all there is."""
    weight = (1 - value) * math.sqrt(2) if name == "duty" else 1.0
    half = format_value(run.jitter_rel, "1", 2)
    return Contribution(
        source="assumed jitter",
        u=abs(value * weight) * run.jitter_rel / math.sqrt(3),
        note=f"half-width {half} of one reading, rectangular",
    )


def _resolution(run: _Run, name: CountedName, item: Readings, value: float) -> Contribution:
    """Return what the counter's resolution gives, as if it were the same error in all readings.

    Both ends of an interval are rounded to a step. A gate holds many periods and is rounded once,
    so that each of them has its share of the step.
    """
    step_s, period_s = run.counted.resolution_s, run.period_s
    long_s = value if name in ("t_high", "t_low", "period") else period_s
    if item.per == "gate" and item.gate_s and period_s:
        step_s /= max(1.0, item.gate_s / period_s)
    relative = step_s / math.sqrt(6) / long_s if long_s else 0.0
    u = relative if name == "duty" else relative * abs(value)
    return Contribution(source="resolution", u=u, note="both ends rounded to a step, triangular")


def _timebase(run: _Run, name: CountedName, value: float) -> Iterator[Contribution]:
    """Return the timebase: it stretches times, so that a frequency falls; a duty stays."""
    if name == "duty":
        return
    yield Contribution(
        source="timebase",
        u=(-value if name == "frequency" else value) * run.timebase_rel / math.sqrt(3),
        common=True,
        note=f"half-width {format_value(run.timebase_rel, '1', 2)}, rectangular",
    )


def _completed(read: Mapping[CountedName, Measured]) -> dict[CountedName, Measured | None]:
    """Add what follows from what was read."""
    t_high, t_low, period = read.get("t_high"), read.get("t_low"), read.get("period")
    frequency = read.get("frequency")
    if period is None and frequency is not None and frequency.value > 0:
        period = propagate(1 / frequency.value, "s", [(-1 / frequency.value**2, frequency)])
    if period is None and t_high is not None and t_low is not None:
        period = propagate(t_high.value + t_low.value, "s", [(1.0, t_high), (1.0, t_low)])
    if frequency is None and period is not None and period.value > 0:
        frequency = propagate(1 / period.value, "Hz", [(-1 / period.value**2, period)])
    return {
        "t_high": t_high or _rest(period, t_low),
        "t_low": t_low or _rest(period, t_high),
        "period": period,
        "frequency": frequency,
        "duty": _duty(t_high, t_low, period) or read.get("duty"),
    }


def _rest(period: Measured | None, width: Measured | None) -> Measured | None:
    """Return what a width leaves of the period."""
    if period is None or width is None or period.value <= width.value:
        return None
    return propagate(period.value - width.value, "s", [(1.0, period), (-1.0, width)])


def _duty(
    t_high: Measured | None, t_low: Measured | None, period: Measured | None
) -> Measured | None:
    """Return the duty from two of the three times; the timebase cancels."""
    if t_high is not None and t_low is not None:
        whole_s = t_high.value + t_low.value
        parts = [(t_low.value / whole_s**2, t_high), (-t_high.value / whole_s**2, t_low)]
        return propagate(t_high.value / whole_s, "1", parts) if whole_s > 0 else None
    if period is None or period.value <= 0:
        return None
    if t_high is not None and t_high.value < period.value:
        share = t_high.value / period.value
        return propagate(share, "1", [(1 / period.value, t_high), (-share / period.value, period)])
    if t_low is not None and t_low.value < period.value:
        share = t_low.value / period.value
        parts = [(-1 / period.value, t_low), (share / period.value, period)]
        return propagate(1 - share, "1", parts)
    return None


def _jitter(counted: Counted) -> Jitter | None:
    """Return the scatter of single periods; of neighbours only where they follow each other."""
    item = counted.readings.get("period")
    if item is None or item.per == "gate" or item.values.size < _LEAST:
        return None
    edges = Edges(
        times_s=np.empty(0),
        rising=np.empty(0, bool),
        u_s=np.empty(0),
        runs=(),
        step_s=counted.resolution_s,
        resolved=False,
    )
    jitter = measure_jitter(_intervals(item), edges)
    return jitter if item.chains else replace(jitter, lag1=None)


def _intervals(item: Readings) -> Intervals:
    """Return single periods as intervals; where they were apart, no neighbours are compared."""
    none = np.empty(0)
    return Intervals(
        high_s=none,
        low_s=none,
        period_s=item.values,
        high_starts_s=none,
        low_starts_s=none,
        period_starts_s=none,
        cycle_high_s=none,
        cycle_low_s=none,
        chains=item.chains,
        active="high",
        other_period_s=none,
    )


def _few(run: _Run) -> Iterator[Notice]:
    alone = [name for name, item in run.counted.readings.items() if item.values.size == 1]
    if alone:
        text = (
            f"only one reading of {', '.join(alone)}: its jitter is assumed to be "
            f"{run.jitter_rel:.2g} of it"
        )
        yield Notice(code="single-reading", text=text)


def _averaged(counted: Counted) -> Iterator[Notice]:
    gated = {name: item for name, item in counted.readings.items() if item.per == "gate"}
    if gated:
        known = [item.gate_s for item in gated.values() if item.gate_s]
        gate = f"a gate of {format_value(max(known), 's')}" if known else "a gate of unknown length"
        text = (
            f"each reading of {', '.join(gated)} is an average over {gate}: their scatter is that "
            "of averages and says nothing of the jitter of single cycles"
        )
        yield Notice(code="gate-averaged", text=text)


def _apart_in_time(counted: Counted) -> Iterator[Notice]:
    item = counted.readings.get("period")
    if item is None or item.per == "gate" or item.chains or item.values.size < _LEAST:
        return
    text = (
        "cycles pass unseen between the counter's readings: there is a jitter of the period, and "
        "none from cycle to cycle"
    )
    yield Notice(code="readings-apart", text=text)


def _disagreement(read: Mapping[CountedName, Measured]) -> Iterator[Notice]:
    """Tell that the widths do not add up to the period, which each run measured by itself."""
    if not {"t_high", "t_low", "period"} <= read.keys():
        return
    t_high, t_low, period = read["t_high"], read["t_low"], read["period"]
    away_s = t_high.value + t_low.value - period.value
    off = propagate(away_s, "s", [(1.0, t_high), (1.0, t_low), (-1.0, period)])
    if abs(away_s) > _APART * off.u + _ROUNDING * period.value:
        text = (
            f"high and low time add up to {t_high.value + t_low.value:.6g} s, the period reads "
            f"{period.value:.6g} s: {format_value(abs(away_s), 's', 2)} apart, more than "
            f"{_APART:.0f} standard uncertainties"
        )
        yield Notice(code="counter-disagrees", text=text)
