"""The course of a node as a curve to be fitted: one exponential a slope, and what bends it."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from benchtool.fitting import Fit, fit_curve
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray, IntArray
from benchtool.node.profiles import Profile

EFFECTS = ("bow", "memory", "memory-tau")
"""What may bend the slopes, as names of parameters."""

_NEWTON_ROUNDS = 6  # each doubles the digits; a bow leaves two to begin with
_SHARED = {True: ("end-charge", "tau-charge"), False: ("end-discharge", "tau-discharge")}


@frozen_record(eq=False)
class Course:
    """Profiles and what is fitted to them.

    With s = 1 on a rise and -1 on a fall the node is at v = V - s·w. Without a bow
    w = A·e^(-t/tau). A capacitance that goes with the voltage as 1 + bow·(v - v_middle) makes
    dw/dt = -(w/tau)/(a - b·w), with a = 1 + bow·(V - v_middle) and b = s·bow, hence
    a·ln(w/A) - b·(w - A) = -t/tau. Memory adds m·kick·e^(-t/memory_s) to w: what the dielectric
    still takes or gives after the jump of the current at a turn.

    Attributes:
        volts, times_s, sign, weights, places: Of all bins of all profiles, shape (n,).
        block: Profile of each bin, shape (n,).
        part: Part of the record of each bin, shape (n,).
        kick: Jump of the node's speed at the turn before each bin over the mean of both turns'.
        names: Shared parameters; the amplitude of each profile follows them.
        n_profiles: Their number.
        middle_v: Voltage to which tau and bow refer.
        memory_s: Time constant of the memory, unless it is fitted.
    """

    volts: FloatArray
    times_s: FloatArray
    sign: FloatArray
    weights: FloatArray
    places: FloatArray
    block: IntArray
    part: IntArray
    kick: FloatArray
    names: tuple[str, ...]
    n_profiles: int
    middle_v: float
    memory_s: float = 1.0

    def with_effects(self, *effects: str) -> Course:
        """Return the course with ``bow``, ``memory`` or ``memory-tau`` among what is fitted."""
        shared = tuple(name for name in self.names if name not in EFFECTS)
        return replace(self, names=(*shared, *effects))

    def curve(self, values: FloatArray) -> FloatArray:
        """Return the volts of all bins."""
        return _State(self, values).volts()

    def slopes(self, values: FloatArray) -> FloatArray:
        """Return their derivatives after the parameters, shape (n, p)."""
        return _State(self, values).slopes()

    def fit(self, start: FloatArray) -> Fit:
        """Fit the course, from a start."""
        return fit_curve(self.curve, self.volts, start, u=1 / self.weights, slopes=self.slopes)

    def extended(self, values: FloatArray, other: Course) -> FloatArray:
        """Return parameters of ``other`` as a start for this course, a new effect being none."""
        known = {"memory-tau": math.log(other.memory_s)}
        known |= dict(zip(other.names, values, strict=False))
        shared = [known.get(name, 0.0) for name in self.names]
        return np.concatenate([shared, values[len(other.names) :]])


class _State:
    """A course at one point of its parameters."""

    def __init__(self, course: Course, values: FloatArray) -> None:
        self.course = course
        named = dict(zip(course.names, values, strict=False))
        rises = course.sign > 0
        ends, log_taus = ([named.get(pair[i], 0.0) for pair in _SHARED.values()] for i in (0, 1))
        self.end = np.where(rises, *ends)
        with np.errstate(all="ignore"):
            self.turns = course.times_s * np.exp(-np.where(rises, *log_taus))
        self.start = values[len(course.names) :][course.block]
        self.bow = named.get("bow", 0.0)
        self.memory = named.get("memory", 0.0)
        self.a = 1 + self.bow * (self.end - course.middle_v)
        self.b = course.sign * self.bow
        self.logs = self._settled()
        self.w = self.start * np.exp(self.logs)
        memory_s = math.exp(min(max(named.get("memory-tau", math.log(course.memory_s)), -99), 99))
        self.ages = course.times_s / memory_s
        self.creep = course.kick * np.exp(-self.ages)

    def _settled(self) -> FloatArray:
        """Return ln(w/A), by Newton's method where there is a bow."""
        logs: FloatArray = -self.turns / self.a
        if self.bow == 0:
            return logs
        pull = self.b * self.start
        for _ in range(_NEWTON_ROUNDS):
            grown = np.exp(logs)
            left = self.a * logs - pull * (grown - 1) + self.turns
            logs = logs - left / (self.a - pull * grown)
        return logs

    def volts(self) -> FloatArray:
        shown: FloatArray = self.end - self.course.sign * (self.w + self.memory * self.creep)
        return shown

    def slopes(self) -> FloatArray:
        course, sign = self.course, self.course.sign
        speed = self.w / (self.a - self.b * self.w)  # -dw/dx, x being t/tau
        to_a = -self.logs * speed
        to_b = (self.w - self.start) * speed
        after_end = 1 - sign * to_a * self.bow
        after_tau = -sign * self.turns * speed
        columns: dict[str, FloatArray] = {
            "bow": -sign * (to_a * (self.end - course.middle_v) + to_b * sign),
            "memory": -sign * self.creep,
            "memory-tau": -sign * self.memory * self.ages * self.creep,
        }
        for rises, (end, tau) in _SHARED.items():
            own = (sign > 0) == rises
            columns[end] = np.where(own, after_end, 0.0)
            columns[tau] = np.where(own, after_tau, 0.0)
        amplitudes = np.zeros((sign.size, course.n_profiles))
        at = (np.arange(sign.size), course.block)
        amplitudes[at] = -sign * (self.a / self.start - self.b) * speed
        return np.column_stack([*(columns[name] for name in course.names), amplitudes])


def lay_course(profiles: Sequence[Profile]) -> tuple[Course, FloatArray]:
    """Return the course of profiles with one exponential each, and where its fit starts."""
    kinds = [rises for rises in (True, False) if any(p.rises is rises for p in profiles)]
    names = tuple(name for rises in kinds for name in _SHARED[rises])
    sizes = [profile.volts.size for profile in profiles]
    volts = np.concatenate([profile.volts for profile in profiles])
    course = Course(
        volts=volts,
        times_s=np.concatenate([profile.times_s for profile in profiles]),
        sign=np.repeat([1.0 if profile.rises else -1.0 for profile in profiles], sizes),
        weights=np.sqrt(np.concatenate([profile.counts for profile in profiles])),
        places=np.concatenate([profile.places for profile in profiles]),
        block=np.repeat(np.arange(len(profiles)), sizes),
        part=np.repeat([profile.part for profile in profiles], sizes),
        kick=np.ones(volts.size),
        names=names,
        n_profiles=len(profiles),
        middle_v=float((volts.max() + volts.min()) / 2),
    )
    guesses = {rises: _guess([p for p in profiles if p.rises is rises]) for rises in kinds}
    shared = [value for rises in kinds for value in guesses[rises]]
    starts = [_amplitude(profile, *guesses[profile.rises]) for profile in profiles]
    return course, np.array([*shared, *starts])


def _guess(profiles: Sequence[Profile]) -> tuple[float, float]:
    """Return asymptote and ln tau of one kind, from the means of thirds.

    Means at equal distances h of an exponential fall as e^(-h/tau).
    """
    profile = max(profiles, key=lambda p: p.volts.size)
    thirds = np.array_split(np.arange(profile.volts.size), 3)
    v = [float(profile.volts[rows].mean()) for rows in thirds]
    t = [float(profile.times_s[rows].mean()) for rows in thirds]
    first, second = v[1] - v[0], v[2] - v[1]
    ratio = second / first if first else 0.7
    ratio = ratio if 0.05 < ratio < 0.98 else 0.7
    end = v[0] + first / (1 - ratio)
    return end, float(np.log((t[2] - t[0]) / 2 / -np.log(ratio)))


def _amplitude(profile: Profile, end: float, log_tau: float) -> float:
    decay = np.exp(-profile.times_s / np.exp(log_tau))
    away = (end - profile.volts) * (1 if profile.rises else -1)
    return float(away @ decay / (decay @ decay))
