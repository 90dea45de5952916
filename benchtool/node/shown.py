"""A node as far as its fitted course, before figures are made of it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from benchtool.errors import MeasurementError
from benchtool.fitting import Fit, Noise, judge_noise
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, middle
from benchtool.model.timing import Edges
from benchtool.node.course import Course, lay_course
from benchtool.node.profiles import Profile, make_profiles
from benchtool.node.slopes import Points, Slope, too_short
from benchtool.node.turns import Form, Turn, place_turns

_MOVES = 0.2  # of the largest way of a slope: what moves less is none
_WIDE, _NARROW = 0.12, 0.02  # of a slope beside a turn: left out before and after it is placed


@frozen_record(eq=False)
class Shown:
    """A course and its fit.

    Attributes:
        points, slopes, profiles: What was fitted.
        turns: The turns that were placed.
        course: The curve.
        fit: Its fit.
        noise: What the noise leaves of its certainty.
    """

    points: Points
    slopes: tuple[Slope, ...]
    profiles: tuple[Profile, ...]
    turns: tuple[Turn, ...]
    course: Course
    fit: Fit
    noise: Noise

    def value(self, name: str) -> float | None:
        """Return a shared parameter, None where it was not fitted."""
        names = self.course.names
        return float(self.fit.values[names.index(name)]) if name in names else None

    def covariance(self, one: str, two: str) -> float:
        """Return the covariance of two shared parameters."""
        names = self.course.names
        return float(self.noise.covariance[names.index(one), names.index(two)])

    def dof(self, name: str) -> float:
        """Return the degrees of freedom of a shared parameter."""
        return float(self.noise.dof[self.course.names.index(name)])

    def refitted(self, course: Course) -> Shown:
        """Return the same with another course."""
        fit = course.fit(course.extended(self.fit.values, self.course))
        return replace(self, course=course, fit=fit, noise=_noise(course, fit))

    def with_turns(self) -> Shown:
        """Return the same with the turns placed by the course as it is now."""
        turns = _turns(self.points, self.slopes, self.course, self.fit.values)
        return replace(self, turns=turns)

    def extended(self, course: Course) -> Shown:
        """Return what one step from here to a course with more parameters gives."""
        start = course.extended(self.fit.values, self.course)
        slopes = course.slopes(start) * course.weights[:, None]
        norms = 1 / np.sqrt(np.einsum("ij,ij->j", slopes, slopes))
        scaled = slopes * norms
        unscaled = np.linalg.inv(scaled.T @ scaled) * np.outer(norms, norms)
        step = unscaled @ (slopes.T @ self.fit.residuals)
        fit = Fit(
            values=start + step,
            unscaled=unscaled,
            slopes=slopes,
            residuals=self.fit.residuals - slopes @ step,
            dof=slopes.shape[0] - slopes.shape[1],
            n_rounds=1,
        )
        return replace(self, course=course, fit=fit, noise=_noise(course, fit))

    def form(self, *, rises: bool) -> Form | None:
        """Return the course of one kind of slope, None where it was not fitted."""
        return _form(self.course, self.fit.values, rises=rises)

    def u_of_end(self, *, rises: bool) -> float:
        """Return the standard uncertainty of the node at the end of a slope, mean of all."""
        rows = self.course.slopes(self.fit.values)
        last = [
            rows[np.flatnonzero(self.course.block == number)[-1]]
            for number, profile in enumerate(self.profiles)
            if profile.rises is rises
        ]
        gradient = np.mean(last, axis=0)
        return float(np.sqrt(max(0.0, gradient @ self.noise.covariance @ gradient)))


def show_course(points: Points, slopes: tuple[Slope, ...]) -> Shown:
    """Fit one exponential to each kind of slope, the turns placed on the way.

    Args:
        points: The samples.
        slopes: The slopes between the first guesses of the turns.

    Raises:
        MeasurementError: ``node-too-short`` where no slope can be fitted, ``fit-failed``.
    """
    course, values, profiles = _fitted(points, slopes, _WIDE)
    turns = _turns(points, slopes, course, values)
    if turns:
        slopes = _moved(points, slopes, turns)
        course, values, profiles = _fitted(points, slopes, _NARROW)
        turns = _turns(points, slopes, course, values)
    fit = course.fit(values)
    return Shown(
        points=points,
        slopes=slopes,
        profiles=profiles,
        turns=turns,
        course=course,
        fit=fit,
        noise=_noise(course, fit),
    )


def _fitted(
    points: Points, slopes: Sequence[Slope], margin_rel: float
) -> tuple[Course, FloatArray, tuple[Profile, ...]]:
    found = make_profiles(points, slopes, margin_rel)
    if not found:
        raise too_short("no slope of the node has enough samples")
    # A node that rests between its slopes (a one-shot's) has a kind that leads nowhere.
    most_v = max(float(np.ptp(profile.volts)) for profile in found)
    moving = [p for p in found if float(np.ptp(p.volts)) > _MOVES * most_v]
    choices = [moving, *([p for p in moving if p.rises is rises] for rises in (True, False))]
    for profiles in (tuple(choice) for choice in choices if choice):
        course, start = lay_course(profiles)
        try:
            return course, course.fit(start).values, profiles
        except MeasurementError:
            continue
    raise too_short("the slopes of the node hardly bend, or drown in noise")


def _noise(course: Course, fit: Fit) -> Noise:
    return judge_noise(fit, course.places, course.block, course.part)


def _turns(
    points: Points, slopes: Sequence[Slope], course: Course, values: FloatArray
) -> tuple[Turn, ...]:
    rise, fall = (_form(course, values, rises=rises) for rises in (True, False))
    return place_turns(points, slopes, rise, fall) if rise and fall else ()


def _form(course: Course, values: FloatArray, *, rises: bool) -> Form | None:
    kind = "charge" if rises else "discharge"
    if f"end-{kind}" not in course.names:
        return None
    shared = values[: len(course.names)]
    sign = 1.0 if rises else -1.0
    names = course.names
    end_v = float(shared[names.index(f"end-{kind}")])
    tau_s = float(np.exp(shared[names.index(f"tau-{kind}")]))

    def plain(amplitude: float, after_s: FloatArray) -> FloatArray:
        volts: FloatArray = end_v - sign * amplitude * np.exp(-after_s / tau_s)
        return volts

    def shape(amplitude: float, after_s: FloatArray) -> FloatArray:
        n = after_s.size
        alone = replace(
            course,
            volts=np.zeros(n),
            times_s=after_s,
            sign=np.full(n, sign),
            kick=np.full(n, course.kick[np.argmax(course.sign * sign)]),
            block=np.zeros(n, np.int64),
            n_profiles=1,
        )
        return alone.curve(np.append(shared, amplitude))

    is_plain = not {"bow", "memory"} & set(names)
    return Form(
        end_v=end_v,
        tau_s=tau_s,
        sign=sign,
        course=plain if is_plain else shape,
        is_plain=is_plain,
    )


def _moved(points: Points, slopes: tuple[Slope, ...], turns: Sequence[Turn]) -> tuple[Slope, ...]:
    """Return the slopes with all turns moved as those that were placed are on the whole."""
    moves: dict[bool, float] = {}
    ends_s = np.array([slope.end_s for slope in slopes])
    for is_upper in (True, False):
        placed_s = np.array([turn.time_s for turn in turns if turn.is_upper is is_upper])
        if placed_s.size:
            guessed_s = np.array([ends_s[np.argmin(np.abs(ends_s - t))] for t in placed_s])
            moves[is_upper] = middle(placed_s - guessed_s)
    found: list[Slope] = []
    for slope in slopes:
        begin_s = slope.begin_s + (moves.get(not slope.rises, 0.0) if slope.begins else 0.0)
        end_s = slope.end_s + (moves.get(slope.rises, 0.0) if slope.ends else 0.0)
        first, stop = (int(x) for x in np.searchsorted(points.times_s, (begin_s, end_s)))
        found.append(replace(slope, begin_s=begin_s, end_s=end_s, first=first, stop=stop))
    return tuple(found)


def n_cycles(edges: Edges) -> int:
    """Return the number of whole cycles between turning points."""
    return sum(max(0, run.stop - run.first - 1) // 2 for run in edges.runs)
