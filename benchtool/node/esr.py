"""The capacitor's series resistance from the jumps at the turns."""

from __future__ import annotations

from dataclasses import replace

from benchtool.model.node import NodeFit
from benchtool.model.quantity import Measured
from benchtool.uncertainty import propagate


def esr_share(step_v: float, before_v: float, ends_v: tuple[float, float], ratio: float) -> float:
    """Return the series resistance over the resistance of the state that begins.

    Args:
        step_v: Jump at the turn against the slope that ends, volts; positive.
        before_v: Node just before it.
        ends_v: Asymptote of the slope that ends, and of the one that begins.
        ratio: Resistance of the state that begins over that of the one that ends.

    References:
        With u inside the capacitor the node is at (u·R + V·r)/(R + r) in each state; u is the same
        on both sides of the turn. Solved for r over the resistance after it.
    """
    ending_v, beginning_v = ends_v
    sign = 1.0 if ending_v > beginning_v else -1.0
    room = sign * (before_v - beginning_v) + sign * (ending_v - before_v) * ratio
    return step_v / (room - step_v)


def resistance_ratio(tau_ratio: float, share: float) -> float:
    """Return R over R' of two states from their time constants and r/R.

    References:
        (R + r)/(R' + r) = tau/tau', hence R'/R = (1 + share)·tau'/tau - share.
    """
    return 1 / ((1 + share) / tau_ratio - share)


def esr_ohm(fit: NodeFit, discharge_ohm: Measured) -> Measured | None:
    """Return the capacitor's series resistance.

    Args:
        fit: The node; its ``esr`` is the share.
        discharge_ohm: Resistance through which it discharges, ohms.

    Returns:
        Ohms, or None where the node does not show both slopes.
    """
    if fit.esr is None:
        return None
    share = replace(fit.esr.size, budget=())
    return propagate(
        share.value * discharge_ohm.value,
        "ohm",
        [(discharge_ohm.value, share), (share.value, discharge_ohm)],
    )
