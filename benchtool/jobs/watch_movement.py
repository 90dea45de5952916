"""Whether readings moved: a self-starting cumulative sum of their standardised differences."""

from __future__ import annotations

import math
from dataclasses import replace
from itertools import pairwise

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.uncertainty import normal_quantile, t_cdf

ALLOWANCE = 0.5
"""Of the cumulative sum, in standard deviations: half the shift that is found soonest."""

BARRIER = 8.0
"""Of the cumulative sum, in standard deviations; see ``READINGS_PER_FALSE_ALARM``."""

AT_ONCE = 4.0
"""A single reading so many standard deviations away has moved."""

READINGS_PER_FALSE_ALARM = 6_000
"""Readings of a still board between two false alarms, in the mean: the sum alone gives 9,600 by
Siegmund's formula, the single reading 15,800 by the normal law."""

_ASSUMED_DOF = 4.0  # the assumed jitter counts as much as four readings
_MOST_DOF = 400.0  # older scatter fades, so that a noisier setting is learnt
_LEAST_TAIL = 1e-15
_LONE = 5  # readings that each seem to move, back and forth, and so are noise


@frozen_record
class Course:
    """What the test knows of the readings since the last movement.

    Attributes:
        n: Intervals since then.
        mean: Their mean.
        scatter_rel2: Relative variance of a single interval, pooled over all movements.
        dof: Degrees of freedom of it.
        above, below: The two cumulative sums.
        lone: Readings that each moved and were alone until the next moved.
    """

    n: int = 0
    mean: float = 0.0
    scatter_rel2: float = 0.0
    dof: float = 0.0
    above: float = 0.0
    below: float = 0.0
    lone: tuple[float, ...] = ()


@frozen_record
class Scatter:
    """What is known of an interval's scatter beforehand, as relative standard deviations.

    Attributes:
        assumed_rel: Taken until enough was seen.
        least_rel: Never less than what the grid and the noise of the edges give.
        negligible_rel: A change below it does not matter: the timebase alone is less sure.
    """

    assumed_rel: float
    least_rel: float
    negligible_rel: float


def follow(course: Course, values: FloatArray, scatter: Scatter) -> tuple[Course, bool]:
    """Take further intervals as one reading, and tell whether it moved.

    Args:
        course: What is known.
        values: Intervals in order, shape (n,) with n >= 1.
        scatter: What is known beforehand.

    Returns:
        What is known now, and whether a new average begins with this reading.

    References:
        Page, "Continuous inspection schemes", Biometrika 41 (1954), for the cumulative sum; with
        mean and deviation learnt on the way: Hawkins, "Self-starting cusum charts for location
        and scale", The Statistician 36 (1987); with a limit on the single reading: Lucas,
        "Combined Shewhart-CUSUM quality control schemes", J. Quality Technology 14 (1982). All
        three from memory. NIST/SEMATECH e-Handbook 6.3.2.3 for the first.
    """
    reading = float(np.mean(values))
    within = float(np.sum((values - reading) ** 2))
    seen = _pooled(course, within / reading**2 if reading else 0.0, values.size - 1)
    if not course.n or not course.mean:
        return _begun(seen, reading, values.size, ()), False
    away = _standardised(seen, reading, values.size, scatter)
    above = max(0.0, course.above + away - ALLOWANCE)
    below = max(0.0, course.below - away - ALLOWANCE)
    found = abs(away) > AT_ONCE or max(above, below) > BARRIER
    if found and abs(reading / course.mean - 1) > scatter.negligible_rel:
        return _after_movement(seen, reading, values.size)
    return _joined(seen, reading, values.size, above, below), False


def _pooled(course: Course, square_rel: float, dof: float) -> Course:
    """Add squares of relative deviations with their degrees of freedom to the scatter known."""
    total = course.dof + dof
    if dof <= 0:
        return course
    variance = (course.scatter_rel2 * course.dof + square_rel) / total
    return replace(course, scatter_rel2=variance, dof=min(total, _MOST_DOF))


def _standardised(course: Course, reading: float, n: int, scatter: Scatter) -> float:
    """Return the difference from the mean as a normal deviate of the same probability."""
    dof = course.dof + _ASSUMED_DOF
    variance = course.scatter_rel2 * course.dof + _ASSUMED_DOF * scatter.assumed_rel**2
    sd_rel = max(math.sqrt(variance / dof), scatter.least_rel)
    if sd_rel == 0:
        return 0.0 if reading == course.mean else math.copysign(2 * BARRIER, reading - course.mean)
    t = (reading / course.mean - 1) / (sd_rel * math.sqrt(1 / n + 1 / course.n))
    tail = max(t_cdf(-abs(t), dof), _LEAST_TAIL)
    return math.copysign(-normal_quantile(tail), t) if tail < 0.5 else 0.0


def _joined(course: Course, reading: float, n: int, above: float, below: float) -> Course:
    """Add a reading to the average; its distance from it is scatter too."""
    total = course.n + n
    between = (reading / course.mean - 1) ** 2 * course.n * n / total
    pooled = _pooled(course, between, 1)
    mean = course.mean + (reading - course.mean) * n / total
    return replace(pooled, n=total, mean=mean, above=above, below=below, lone=())


def _after_movement(course: Course, reading: float, n: int) -> tuple[Course, bool]:
    """Begin anew with a reading, unless single ones go back and forth: those are noise."""
    was_alone = course.n == 1
    lone = (*course.lone, course.mean) if was_alone else ()
    if n == 1 and len(lone) == _LONE - 1 and _alternate((*lone, reading)):
        values = np.array((*lone, reading))
        square_rel = float(np.sum((values / values.mean() - 1) ** 2))
        course, lone = _pooled(course, square_rel, _LONE - 1), ()
    return _begun(course, reading, n, lone[-(_LONE - 2) :]), True


def _alternate(values: tuple[float, ...]) -> bool:
    steps = [after - before for before, after in pairwise(values)]
    return all(a * b < 0 for a, b in pairwise(steps))


def _begun(course: Course, mean: float, n: int, lone: tuple[float, ...]) -> Course:
    return replace(course, n=n, mean=mean, above=0.0, below=0.0, lone=lone)
