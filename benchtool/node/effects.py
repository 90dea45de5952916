"""What bends the slopes of a node beside their exponentials, and whether it stands out."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from benchtool.errors import MeasurementError
from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.model.node import Effect
from benchtool.model.quantity import Contribution, Measured
from benchtool.node.course import EFFECTS, Course
from benchtool.node.shown import Shown
from benchtool.uncertainty import combine, t_cdf

CHANCE = 1e-4
"""Chance of a false alarm up to which an effect is taken as seen."""

_QUICK = (2.5, 4.0, 8.0, 16.0)  # how many times faster memory may creep than the slope
_MATTERS = {"bow": 0.003, "memory": 0.001}  # of the swing: smaller ones bend nothing to speak of


@frozen_record(eq=False)
class Bent:
    """The course that was settled on, and the two effects.

    Attributes:
        shown: With those effects that are seen among its parameters.
        bow, memory: The effects; None where a single kind of slope cannot tell them apart.
    """

    shown: Shown
    bow: Effect | None = None
    memory: Effect | None = None


def find_bends(plain: Shown, swing_v: float) -> Bent:
    """Look for a bow and for memory.

    A bow moves both slopes to the same side of their exponentials, memory to opposite sides: both
    kinds are needed to tell them apart.

    Args:
        plain: The node with an exponential a slope.
        swing_v: From turn to turn, volts.
    """
    if len(plain.course.names) < 4:
        return Bent(shown=plain)
    course = _ready(plain)
    bowed = plain.extended(course.with_effects("bow"))
    remembering = plain.extended(course.with_effects("memory"))
    bow, memory = _bow(bowed, swing_v), _memory(remembering, swing_v)
    guessed = Bent(shown=plain, bow=bow, memory=memory)
    if min(bow.p_value, memory.p_value) > CHANCE:
        return _unseen(guessed)
    if memory.p_value < CHANCE:  # it may hide a bow; a bow does not hide it
        joint = _refitted(plain.extended(course.with_effects("bow", "memory")))
        if joint and _bow(joint, swing_v).seen and _memory(joint, swing_v).seen:
            found = replace(guessed, bow=_bow(joint, swing_v), memory=_memory(joint, swing_v))
            return replace(found, shown=_freed(joint).with_turns())
    return _one_alone(guessed, bowed, remembering, swing_v)


def _one_alone(guessed: Bent, bowed: Shown, remembering: Shown, swing_v: float) -> Bent:
    """Return the effect that leaves less of those that stood out, where it still does.

    Whether memory is there is asked at one time constant: with that free its size means little.
    """
    unseen = _unseen(guessed)
    assert guessed.bow is not None
    assert guessed.memory is not None
    bow_fit = _refitted(bowed) if guessed.bow.p_value < CHANCE else None
    memory_fit = _refitted(remembering) if guessed.memory.p_value < CHANCE else None
    left = [shown.fit.sum_of_squares if shown else math.inf for shown in (bow_fit, memory_fit)]
    if bow_fit and left[0] <= left[1] and _bow(bow_fit, swing_v).seen:
        return replace(unseen, shown=bow_fit.with_turns(), bow=_bow(bow_fit, swing_v))
    if memory_fit and left[1] < left[0] and _memory(memory_fit, swing_v).seen:
        memory = _memory(memory_fit, swing_v)
        return replace(unseen, shown=_freed(memory_fit).with_turns(), memory=memory)
    return unseen


def _unseen(guessed: Bent) -> Bent:
    bow, memory = guessed.bow, guessed.memory
    return replace(
        guessed,
        bow=bow and replace(bow, seen=False),
        memory=memory and replace(memory, seen=False),
    )


def _refitted(begun: Shown) -> Shown | None:
    """Return the fit of a course with effects, None where the slopes do not fix them."""
    try:
        return begun.refitted(begun.course)
    except MeasurementError:
        return None


def _freed(shown: Shown) -> Shown:
    """Return the fit with the time constant of the memory free, where the slopes fix it."""
    names = (name for name in shown.course.names if name in EFFECTS)
    freed = shown.course.with_effects(*names, "memory-tau")
    try:
        return shown.refitted(freed)
    except MeasurementError:
        return shown


def _bow(shown: Shown, swing_v: float) -> Effect:
    return _effect(shown, "bow", swing_v, 1)


def _memory(shown: Shown, swing_v: float) -> Effect:
    return _effect(shown, "memory", swing_v, len(_QUICK))


def _ready(plain: Shown) -> Course:
    """Return the course with the memory that leaves least, each tried on the linearised one."""
    fit, at = plain.fit, len(plain.course.names)
    usual_s = math.exp(plain.value("tau-discharge") or 0.0)
    gains: dict[float, Course] = {}
    for quick in _QUICK:
        course = replace(plain.course, kick=_kicks(plain), memory_s=usual_s / quick)
        column = (
            course.with_effects("memory").slopes(
                course.with_effects("memory").extended(fit.values, plain.course)
            )[:, at]
            * course.weights
        )
        own = column - fit.slopes @ (fit.unscaled @ (fit.slopes.T @ column))
        gains[float(own @ fit.residuals) ** 2 / float(own @ own)] = course
    return gains[max(gains)]


def _kicks(plain: Shown) -> FloatArray:
    """Return how much the speed of the node jumps at the turn before each bin, relative.

    The current into the memory follows the speed, so that what creeps goes with that jump.
    """
    volts, rises = plain.course.volts, plain.course.sign > 0
    turns_v = {True: float(volts.min()), False: float(volts.max())}
    jumps = dict.fromkeys(turns_v, 0.0)
    for kind in ("charge", "discharge"):
        end_v, tau_s = plain.value(f"end-{kind}") or 0.0, plain.value(f"tau-{kind}") or 0.0
        for after, turn_v in turns_v.items():
            jumps[after] += abs(end_v - turn_v) / math.exp(tau_s)
    kicks: FloatArray = np.where(rises, jumps[True], jumps[False]) * 2 / sum(jumps.values())
    return kicks


def _effect(shown: Shown, name: str, swing_v: float, n_tried: int) -> Effect:
    value, u = shown.value(name) or 0.0, math.sqrt(shown.covariance(name, name))
    scale = 1.0 if name == "bow" else 1 / swing_v
    unit = "1/V" if name == "bow" else "1"
    noise = Contribution(source="noise", u=u * scale, dof=shown.dof(name))
    size = combine(value * scale, unit, [noise], n=shown.course.n_profiles)
    chance = min(1.0, n_tried * chance_of(size))
    in_swing = abs(size.value) * (swing_v if name == "bow" else 1.0)
    return Effect(seen=chance < CHANCE and in_swing > _MATTERS[name], size=size, p_value=chance)


def chance_of(size: Measured) -> float:
    """Return the two-sided chance of a figure so far from zero where the truth is zero."""
    if size.u == 0:
        return 1.0 if size.value == 0 else 0.0
    return 2 * (1 - t_cdf(abs(size.value) / size.u, size.dof))
