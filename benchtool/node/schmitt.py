"""A Schmitt oscillator from its three times: R·C and both thresholds."""

from __future__ import annotations

import math

import numpy as np

from benchtool.errors import SolveError
from benchtool.model.arrays import FloatArray
from benchtool.model.node import SchmittSolution
from benchtool.model.quantity import Measured
from benchtool.node.roots import find_root
from benchtool.uncertainty import propagate

_MOST_TAUS = 60.0
_SLOWEST = 1e4  # over the first high


def solve_schmitt(
    t_first: Measured, t_high: Measured, t_low: Measured, *, low_rel: float = 0.0
) -> SchmittSolution:
    """Return R·C and both thresholds of a Schmitt oscillator from its three times.

    Args:
        t_first: First high after power-up, the node beginning at 0 V, seconds.
        t_high: The steady high time, seconds.
        t_low: The steady low time, seconds.
        low_rel: Low level of the output over its high level.

    Returns:
        R·C, and the thresholds as shares of the output's high level.

    Raises:
        SolveError: ``no-solution`` where no thresholds give such times.

    References:
        With a = VU/V, b = VL/V: t_first = RC·ln[1/(1 - a)], t_high = RC·ln[(1 - b)/(1 - a)],
        t_low = RC·ln[(a - l)/(b - l)]; a and b follow from RC, and t_low settles RC.
    """
    times = (t_first, t_high, t_low)
    values = np.array([item.value for item in times])
    solution = _schmitt(values, low_rel)
    factors = np.empty((3, 3))
    for index in range(3):
        ahead, behind = values.copy(), values.copy()
        small = 1e-5 * values[index]
        ahead[index] += small
        behind[index] -= small
        factors[:, index] = (_schmitt(ahead, low_rel) - _schmitt(behind, low_rel)) / (2 * small)
    found = [
        propagate(
            float(solution[row]),
            unit,
            [(float(factors[row, i]), item) for i, item in enumerate(times)],
        )
        for row, unit in enumerate(("s", "1", "1"))
    ]
    return SchmittSolution(tau=found[0], upper=found[1], lower=found[2])


def _schmitt(times_s: FloatArray, low_rel: float) -> FloatArray:
    t_first, t_high, t_low = (float(x) for x in times_s)

    def thresholds(tau_s: float) -> tuple[float, float]:
        return -math.expm1(-t_first / tau_s), -math.expm1(-(t_first - t_high) / tau_s)

    def left(log_tau: float) -> float:
        upper, lower = thresholds(math.exp(log_tau))
        if lower <= low_rel:
            return 1.0  # so slow a node would never get so low
        return math.log((upper - low_rel) / (lower - low_rel)) - t_low / math.exp(log_tau)

    if not 0 < t_high < t_first or t_low <= 0:
        raise _no_schmitt("the first high must be longer than the others")
    log_tau = find_root(left, math.log(t_first / _MOST_TAUS), math.log(t_first * _SLOWEST))
    if log_tau is None:
        raise _no_schmitt("no thresholds give these three times")
    return np.array([math.exp(log_tau), *thresholds(math.exp(log_tau))])


def _no_schmitt(text: str) -> SolveError:
    return SolveError(
        text,
        hint="Check that the capacitor was empty and that the supply came up at once.",
    )
