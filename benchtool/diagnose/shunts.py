"""Which resistor to clip across the capacitor, such that the circuit still runs."""

from __future__ import annotations

from collections.abc import Callable

from benchtool.circuits import find_topology
from benchtool.model.design import Stage
from benchtool.parts.series import neighbours

Asymptote = Callable[[float], float]
"""From ohms across the capacitor to how far the node would clear its upper threshold at least, as
a share of the supply, over all live suspects."""

_USUAL, _LEAST, _MOST = 5.0, 3.0, 40.0
"""Multiples of the charging resistance."""

_CLEARANCE = 0.10
_A_STEP_UP = 1.05


def choose_shunt(stage: Stage, asymptote: Asymptote) -> float | None:
    """Return ohms of the E12 series, None where no resistor is safe.

    Args:
        stage: Its resistors set the scale.
        asymptote: How far the node would clear its upper threshold with that many ohms.

    References:
        The smaller it is the more it tells, until it stops the oscillation: near five times the
        charging resistance, never below three times, with 10 % of the supply to spare.
    """
    charging = find_topology(stage.topology).resistors[0]
    total = sum(stage.parts[ref].value for ref in charging)
    below, above = neighbours(_USUAL * total, "E12")
    ohm = below if _USUAL * total / below <= above / (_USUAL * total) else above
    while ohm <= _MOST * total:
        if ohm >= _LEAST * total and asymptote(ohm) >= _CLEARANCE:
            return ohm
        ohm = neighbours(ohm * _A_STEP_UP, "E12")[1]
    return None
