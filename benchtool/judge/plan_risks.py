"""What a decision rule does to a lot of boards: shares of verdicts, producer's and consumer's risk.

References:
    JCGM 106:2012: clause 9.3 (specific and global risk), 9.5.2 to 9.5.4 (global consumer's and
    producer's risk as integrals over the true value and the measured one). Here the integral over
    the true value is the mean over boards, and that over the measured one is in closed form.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from functools import cache

import numpy as np

from benchtool.model.arrays import FloatArray
from benchtool.model.plan import PlannedQuantity, Risks

_REACH, _STEP = 9.0, 1 / 512
_SEED = 20310304


@cache
def _table() -> tuple[FloatArray, FloatArray]:
    """Return the normal law in points 1/512 apart: straight lines between them err by 1e-7."""
    x = np.arange(-_REACH, _REACH + _STEP / 2, _STEP)
    return x, np.array([math.erfc(-value / math.sqrt(2)) / 2 for value in x])


def _below(limit: float | None, true: FloatArray, u: float) -> FloatArray:
    """Return the probability that the measured value lies below a limit; 0 where it is None."""
    if limit is None:
        return np.zeros(true.size)
    if u == 0:
        return np.where(true < limit, 1.0, 0.0)
    return np.interp((limit - true) / u, *_table())


def _between(true: FloatArray, u: float, lower: float | None, upper: float | None) -> FloatArray:
    top = np.ones(true.size) if upper is None else _below(upper, true, u)
    return np.maximum(0.0, top - _below(lower, true, u))


def judge_lot(
    true: FloatArray, u: float, w: float, lower: float | None, upper: float | None
) -> Risks:
    """Return what a guard band does to boards whose true values are known.

    Args:
        true: True values, shape (n,); NaN for a board that stands still.
        u: Standard uncertainty of a measured value, taken as normal.
        w: Guard band: accepted from lower + w to upper - w, rejected beyond lower - w and
            upper + w.
        lower: Lower limit, None where open.
        upper: Upper limit, likewise.

    References:
        JCGM 106:2012, 9.5.2 to 9.5.4.
    """
    runs = np.isfinite(true)
    value = np.where(runs, true, 0.0)
    conforming = runs.copy()
    if lower is not None:
        conforming &= value >= lower
    if upper is not None:
        conforming &= value <= upper
    inner = (None if lower is None else lower + w, None if upper is None else upper - w)
    outer = (None if lower is None else lower - w, None if upper is None else upper + w)
    accepted = _between(value, u, *inner) * runs
    not_failed = _between(value, u, *outer) * runs
    return Risks(
        conforming=float(conforming.mean()),
        consumer=float((accepted * ~conforming).mean()),
        producer=float(((1 - accepted) * conforming).mean()),
        passing=float(accepted.mean()),
        undecided=float((not_failed - accepted).mean()),
        failing=float(1 - not_failed.mean()),
    )


def judge_boards(
    rows: Mapping[str, FloatArray], planned: Sequence[PlannedQuantity]
) -> Risks | None:
    """Return the same for whole boards, each with the worst verdict of its quantities.

    Errors of different quantities are drawn independently, from a fixed seed.

    Args:
        rows: Quantity to its true values, one a board.
        planned: What is judged; a quantity without an interval in the record is undecided.

    Returns:
        None where nothing is judged that the parts determine.
    """
    judged = [item for item in planned if item.quantity in rows]
    if not judged:
        return None
    size = rows[judged[0].quantity].size
    rng = np.random.default_rng(_SEED)
    good, passing, failing = (np.full(size, state) for state in (True, True, False))
    for item in judged:
        true = rows[item.quantity]
        low, high = _open(item.lower, -math.inf), _open(item.upper, math.inf)
        good &= (true >= low) & (true <= high)
        if item.expected is None or item.w is None:
            passing[:] = False
            continue
        seen = true + item.expected.u * rng.standard_normal(size)
        passing &= (seen >= low + item.w) & (seen <= high - item.w)
        failing |= ~((seen >= low - item.w) & (seen <= high + item.w))
    return Risks(
        conforming=float(good.mean()),
        consumer=float((passing & ~good).mean()),
        producer=float((~passing & good).mean()),
        passing=float(passing.mean()),
        undecided=float((~passing & ~failing).mean()),
        failing=float(failing.mean()),
    )


def _open(limit: float | None, otherwise: float) -> float:
    return otherwise if limit is None else limit
