"""The turns of a node: when exactly it turns, at what voltage, and how far it jumps there."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from itertools import pairwise

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.quantity import Contribution, Measured
from benchtool.node.slopes import Points, Slope
from benchtool.uncertainty import combine

MOST_TURNS = 48
"""Turns that are looked at, spread over the record."""

_NEAR = 0.15  # of the shorter slope: how far from its first guess a turn is looked for
_FEW = 3  # turns from which their scatter counts

Shape = Callable[[FloatArray], FloatArray]
"""Seconds after the begin of a slope to what its amplitude is multiplied with."""


@frozen_record(eq=False)
class Form:
    """The fitted course of one kind of slope but for its amplitude.

    Attributes:
        end_v: Where it settles.
        tau_s: How fast.
        sign: 1 on a rise, -1 on a fall.
        course: Amplitude and seconds after the begin to volts.
        is_plain: Whether that is an exponential and nothing else.
    """

    end_v: float
    tau_s: float
    sign: float
    course: Callable[[float, FloatArray], FloatArray]
    is_plain: bool


@frozen_record
class Turn:
    """One turn.

    Attributes:
        is_upper: Whether a rise ends.
        time_s: When; between two samples.
        before_v: Node just before it, by the slope that ends.
        after_v: Node just after it, by the slope that begins.
    """

    is_upper: bool
    time_s: float
    before_v: float
    after_v: float

    @property
    def step_v(self) -> float:
        """Jump against the slope that ends."""
        return self.before_v - self.after_v if self.is_upper else self.after_v - self.before_v


def place_turns(
    points: Points, slopes: Sequence[Slope], rise: Form, fall: Form
) -> tuple[Turn, ...]:
    """Place the turns between neighbouring slopes, each between two samples.

    Left of a turn the samples follow the slope that ends, right of it the one that begins; the
    turn lies where the squares of what is left over are least. Unlike the crossing of the two
    slopes that place does not move where the node jumps.

    Args:
        points: The samples.
        slopes: All slopes in order.
        rise: The fitted course of a rise.
        fall: The same of a fall.
    """
    pairs = [
        (one, two)
        for one, two in pairwise(slopes)
        if one.stop == two.first and one.ends and two.begins
    ]
    # An odd stride takes upper and lower turns in turn.
    chosen = pairs[:: max(1, math.ceil(len(pairs) / MOST_TURNS)) | 1]
    return tuple(_place(points, one, two, rise, fall) for one, two in chosen)


def _place(points: Points, one: Slope, two: Slope, rise: Form, fall: Form) -> Turn:
    before = _fitted(points, one, rise if one.rises else fall)
    after = _fitted(points, two, rise if two.rises else fall)
    guess_s = one.end_s
    reach_s = _NEAR * min(one.end_s - one.begin_s, two.end_s - two.begin_s)
    first, stop = np.searchsorted(points.times_s, (guess_s - reach_s, guess_s + reach_s))
    first, stop = max(int(first), one.first + 1), min(int(stop), two.stop - 1)
    times_s, volts = points.times_s[first:stop], points.volts[first:stop]
    worse = (volts - before(times_s)) ** 2 - (volts - after(times_s)) ** 2
    cost = np.concatenate([[0.0], np.cumsum(worse)])
    at = int(np.argmin(cost))
    index = min(max(first + at, 1), points.times_s.size - 1)
    time_s = float(points.times_s[index - 1] + points.times_s[index]) / 2
    then = np.array([time_s])
    return Turn(
        is_upper=one.rises,
        time_s=time_s,
        before_v=float(before(then)[0]),
        after_v=float(after(then)[0]),
    )


def _fitted(points: Points, slope: Slope, form: Form) -> Shape:
    """Return the course of one slope, its amplitude fitted to its inner samples."""
    margin = max(1, int(_NEAR * (slope.stop - slope.first)))
    rows = slice(slope.first + (margin if slope.begins else 0), slope.stop - margin * slope.ends)
    if points.times_s[rows].size < 2:
        rows = slice(slope.first, slope.stop)
    after_s, volts = points.times_s[rows] - slope.begin_s, points.volts[rows]
    amplitude = _amplitude(form, after_s, volts)
    return lambda times_s: form.course(amplitude, times_s - slope.begin_s)


def _amplitude(form: Form, after_s: FloatArray, volts: FloatArray) -> float:
    decay = np.exp(-after_s / form.tau_s)
    amplitude = float(form.sign * (form.end_v - volts) @ decay / (decay @ decay))
    for _ in range(0 if form.is_plain else 2):  # a bow makes the course bend with its amplitude
        small = 1e-4 * (abs(amplitude) or 1.0)
        now = form.course(amplitude, after_s)
        slope = (form.course(amplitude + small, after_s) - now) / small
        amplitude += float((volts - now) @ slope / (slope @ slope))
    return amplitude


def turn_level(turns: Sequence[Turn], grid_v: float, lines: Sequence[Contribution]) -> Measured:
    """Return the voltage before the turns of one kind.

    Args:
        turns: Turns of one kind, one or more.
        grid_v: How far the node runs from sample to sample: a turn lies anywhere between two.
        lines: What else leaves the voltage uncertain.
    """
    return _mean([turn.before_v for turn in turns], grid_v, lines)


def turn_step(turns: Sequence[Turn], grid_v: float, lines: Sequence[Contribution]) -> Measured:
    """Return the jump at the turns of one kind; see ``turn_level``."""
    return _mean([turn.step_v for turn in turns], grid_v, lines)


def _mean(values: list[float], grid_v: float, lines: Sequence[Contribution]) -> Measured:
    n = len(values)
    grid = grid_v / math.sqrt(12) / (math.sqrt(n) if n >= _FEW else 1.0)
    scatter = float(np.std(values, ddof=1)) / math.sqrt(n) if n >= _FEW else 0.0
    if scatter > grid:
        own = Contribution(source="turns", u=scatter, dof=n - 1, note=f"{n} turns")
    else:
        own = Contribution(source="grid", u=grid, note="a turn between two samples")
    return combine(float(np.mean(values)), "V", [*lines, own], n=n)
