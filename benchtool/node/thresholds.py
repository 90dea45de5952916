"""Thresholds and jumps of a node from its placed turns."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from benchtool.model.node import Effect, NodeFit, SlopeFit
from benchtool.model.quantity import Contribution, Measured
from benchtool.node.effects import CHANCE, chance_of
from benchtool.node.esr import esr_share, resistance_ratio
from benchtool.node.shown import Shown
from benchtool.node.slopes import Slope
from benchtool.node.terms import Terms, volts
from benchtool.node.turns import turn_level, turn_step
from benchtool.uncertainty import combine, propagate

_ESR_MATTERS = 0.001  # of the resistance of the discharge


def add_thresholds(found: NodeFit, shown: Shown, terms: Terms, code_v: float) -> NodeFit:
    """Return the figures with thresholds and jumps, as far as there are turns.

    Args:
        found: The figures so far.
        shown: The fitted course with its turns.
        terms: What is known of instrument and IC.
        code_v: Step of the samples' codes, volts, 0 where they have none.
    """
    if found.charge is None or found.discharge is None or not shown.turns:
        return _without_turns(found, shown, terms)
    codes = _codes(code_v, found.noise_v)
    upper, step_upper = _at_turns(found.charge, found.discharge, shown, terms, codes)
    lower, step_lower = _at_turns(found.discharge, found.charge, shown, terms, codes)
    found = replace(
        found,
        turn_upper=upper,
        turn_lower=lower,
        step_upper=step_upper,
        step_lower=step_lower,
    )
    return replace(_with_thresholds(found, terms), esr=_esr(found))


def _codes(code_v: float, noise_v: float) -> Contribution:
    """Return what the codes leave uncertain of a voltage where noise does not blur them.

    A turn comes at the same place between two codes each time. Noise of half a code lets the mean
    of many samples see between them.
    """
    own_v = math.sqrt(max(0.0, noise_v**2 - code_v**2 / 12))
    plain = max(0.0, 1 - own_v / (code_v / 2)) if code_v else 0.0
    return Contribution(source="codes", u=plain * code_v / math.sqrt(12), note="one step of them")


def _at_turns(
    ending: SlopeFit, beginning: SlopeFit, shown: Shown, terms: Terms, codes: Contribution
) -> tuple[Measured | None, Measured | None]:
    """Return the voltage before the turns that end one kind of slope, and the jump at them."""
    is_upper = ending.end.value > beginning.end.value
    turns = [turn for turn in shown.turns if turn.is_upper is is_upper]
    if not turns:
        return None, None
    at_v = float(np.mean([turn.before_v for turn in turns]))
    speeds = [abs(slope.end.value - at_v) / slope.tau.value for slope in (ending, beginning)]
    dof, step_s = float(shown.noise.dof.min()), shown.points.step_s
    own = Contribution(source="noise", u=shown.u_of_end(rises=is_upper), dof=dof)
    other = replace(own, u=math.hypot(own.u, shown.u_of_end(rises=not is_upper)))
    level = turn_level(turns, step_s * speeds[0], (own, codes))
    jump = turn_step(turns, step_s * sum(speeds), (other, codes))
    return volts(level.value, list(level.budget), level.n, terms), jump


def _without_turns(found: NodeFit, shown: Shown, terms: Terms) -> NodeFit:
    """Return the thresholds from slopes of one kind that end in a turn, the other being quick."""
    rises = found.charge is not None
    slopes = [slope for slope in shown.slopes if slope.rises is rises and slope.ends]
    form = shown.form(rises=rises)
    if not slopes or form is None or not shown.profiles:
        return found
    ends = [_end_of(shown, slope) for slope in slopes]
    dof = float(shown.noise.dof.min())
    own = Contribution(source="noise", u=shown.u_of_end(rises=rises), dof=dof)
    speed = abs(form.end_v - float(np.mean(ends))) / form.tau_s
    grid = Contribution(source="grid", u=speed * shown.points.step_s, note="the turn's time")
    level = volts(float(np.mean(ends)), [own, grid], len(ends), terms)
    if rises:
        return _with_thresholds(replace(found, turn_upper=level), terms)
    return _with_thresholds(replace(found, turn_lower=level), terms)


def _end_of(shown: Shown, slope: Slope) -> float:
    """Return the node at the end of a slope, from the profile of its kind."""
    form = shown.form(rises=slope.rises)
    assert form is not None
    number = next(i for i, p in enumerate(shown.profiles) if p.rises is slope.rises)
    amplitude = float(shown.fit.values[len(shown.course.names) + number])
    return float(form.course(amplitude, np.array([slope.end_s - slope.begin_s]))[0])


def _with_thresholds(found: NodeFit, terms: Terms) -> NodeFit:
    upper, overshoot_upper = _threshold(found.turn_upper, found.charge, terms.delay_upper)
    lower, overshoot_lower = _threshold(found.turn_lower, found.discharge, terms.delay_lower)
    return replace(
        found,
        upper=upper,
        lower=lower,
        overshoot_upper=overshoot_upper,
        overshoot_lower=overshoot_lower,
    )


def _threshold(
    turn: Measured | None, slope: SlopeFit | None, delay: Measured | None
) -> tuple[Measured | None, Measured | None]:
    """Return the threshold and the overshoot, V - (V - v)·e^(delay/tau) being the threshold."""
    if turn is None or slope is None or delay is None:
        return turn, None
    grown = math.exp(delay.value / slope.tau.value)
    left_v = slope.end.value - turn.value
    overshoot_v = left_v * (grown - 1)
    speed = left_v * grown / slope.tau.value
    threshold = propagate(
        turn.value - overshoot_v, "V", [(grown, turn), (1 - grown, slope.end), (-speed, delay)]
    )
    overshoot = propagate(
        abs(overshoot_v), "V", [(grown - 1, turn), (grown - 1, slope.end), (speed, delay)]
    )
    return threshold, overshoot


def _esr(found: NodeFit) -> Effect | None:
    """Return the series resistance over the resistance of the discharge."""
    charge, discharge = found.charge, found.discharge
    if charge is None or discharge is None:
        return None
    tau_ratio = discharge.tau.value / charge.tau.value
    shares: list[Measured] = []
    for name, is_upper in (("upper", True), ("lower", False)):
        step: Measured | None = getattr(found, f"step_{name}")
        turn: Measured | None = getattr(found, f"turn_{name}")
        if step is None or turn is None:
            continue
        ends_v = (charge.end.value, discharge.end.value)
        share = 0.0
        for _ in range(20):
            ratio = resistance_ratio(tau_ratio, share)
            if is_upper:
                share = esr_share(step.value, turn.value, ends_v, ratio)
            else:
                share = esr_share(step.value, turn.value, ends_v[::-1], 1 / ratio) / ratio
        u = abs(step.u * share / step.value) if step.value else 0.0
        shares.append(combine(share, "1", [Contribution(source=name, u=u, dof=step.dof)]))
    if not shares or any(share.u == 0 for share in shares):
        return None
    weights = [1 / share.u**2 for share in shares]
    total = sum(weights)
    size = propagate(
        sum(w * s.value for w, s in zip(weights, shares, strict=True)) / total,
        "1",
        [(w / total, s) for w, s in zip(weights, shares, strict=True)],
    )
    chance = chance_of(size)
    return Effect(seen=chance < CHANCE and size.value > _ESR_MATTERS, size=size, p_value=chance)
