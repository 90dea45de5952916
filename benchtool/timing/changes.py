"""Where samples change sides of the mid level: only rows that can hold a change are looked into."""

from __future__ import annotations

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, NDArray
from benchtool.timing.rows import ROW, Codes, Rows
from benchtool.timing.thresholds import Thresholds

_MOST_ROWS = 0.5  # share of rows to look into, from which all of the samples are looked at
_FEW = 16  # stretches that are looked at one by one

Index = NDArray[np.int64]


@frozen_record(eq=False)
class Changes:
    """Changes of side in consecutive samples.

    Attributes:
        at: Position of the first sample on the other side, ascending, shape (n,).
        settled: Whether each stretch before, between and after the changes reaches the reference
            level of its side, shape (n + 1,).
    """

    at: Index
    settled: BoolArray


def find_changes(values: Codes, rows: Rows, limits: Thresholds, *, was_above: bool) -> Changes:
    """Find the changes of side, and which stretches between them settle.

    Args:
        values: Consecutive samples, all present, shape (n,) with n >= 1.
        rows: Their extremes.
        limits: Reference levels.
        was_above: Side of the sample before.
    """
    reached = (rows.greatest >= limits.rests_above) | (rows.least <= limits.rests_below)
    looked, begins_new = _rows_with_changes(values, rows, limits, was_above=was_above)
    if not looked.size:
        return Changes(at=looked, settled=np.array([reached.any()]))
    if looked.size > _MOST_ROWS * reached.size:
        starts = np.array([bool(values[0] >= limits.is_above) != was_above])
        at = _positions(values, starts, values.size, limits)
        return Changes(at=at, settled=_settle(values, at, np.zeros(at.size + 1, np.bool_), limits))
    gathered = _gather(values, looked)
    found = _positions(gathered, begins_new, ROW, limits)
    at = looked[found // ROW] * ROW + found % ROW
    settled = _settled_between(looked, at, reached)
    return Changes(at=at, settled=_settle(gathered, found, settled, limits))


def _rows_with_changes(
    values: Codes, rows: Rows, limits: Thresholds, *, was_above: bool
) -> tuple[Index, BoolArray]:
    """Return the rows that hold a change, and which of them begin with one."""
    above, below = rows.least >= limits.is_above, rows.greatest < limits.is_above
    alike = np.empty_like(above)
    alike[0] = above[0] if was_above else below[0]
    alike[1:] = (above[1:] & above[:-1]) | (below[1:] & below[:-1])
    unlike = (~alike).nonzero()[0]
    starts = unlike * ROW
    before = values[starts - 1] >= limits.is_above
    if unlike.size and unlike[0] == 0:
        before[0] = was_above
    begins_new = (values[starts] >= limits.is_above) != before
    holds = begins_new | ~(above | below)[unlike]
    return unlike[holds], begins_new[holds]


def _gather(values: Codes, looked: Index) -> Codes:
    """Return the rows, one after another; a last row that is cut is filled up with its last."""
    whole = values.size // ROW
    if looked[-1] < whole:
        return values[: whole * ROW].reshape(whole, ROW)[looked].ravel()
    last = values[whole * ROW :]
    fill = np.full(ROW - last.size, last[-1])
    return np.concatenate(
        [values[: whole * ROW].reshape(whole, ROW)[looked[:-1]].ravel(), last, fill]
    )


def _positions(values: Codes, begins_new: BoolArray, row: int, limits: Thresholds) -> Index:
    """Return the positions of changes in rows that need not follow one another."""
    above = values >= limits.is_above
    changed = np.empty_like(above)
    np.not_equal(above[1:], above[:-1], out=changed[1:])
    changed[::row] = begins_new
    return changed.nonzero()[0]


def _settled_between(looked: Index, at: Index, reached: BoolArray) -> BoolArray:
    """Tell which stretches reach their reference level in a row that was not looked into.

    ``reached`` tells of each row whether it reaches a level: which, its side says.
    """
    settled = np.zeros(at.size + 1, np.bool_)
    settled[0] = reached[: looked[0]].any()
    reached[looked] = False
    after = np.logical_or.reduceat(reached, looked)
    settled[np.searchsorted(at, (looked[after] + 1) * ROW)] = True
    return settled


def _settle(values: Codes, at: Index, settled: BoolArray, limits: Thresholds) -> BoolArray:
    """Tell also which stretches reach it in these samples.

    Most stretches do so at their middle, so all samples are looked at only where one does not. A
    sample at or beyond a reference level is on that level's side, and so is all of its stretch.
    """
    if settled.all():
        return settled
    bounds = np.concatenate([[0], at, [values.size]])
    middles = values[np.minimum((bounds[1:] + bounds[:-1]) // 2, values.size - 1)]
    settled |= _rests(middles, limits) & (bounds[1:] > bounds[:-1])
    left = (~settled).nonzero()[0]
    if left.size > _FEW:
        whole = np.concatenate([bounds[:1], at]) if at[0] else at  # the first may be empty
        settled[-whole.size :] |= np.logical_or.reduceat(_rests(values, limits), whole)
    else:
        for i in left:
            settled[i] = _rests(values[bounds[i] : bounds[i + 1]], limits).any()
    return settled


def _rests(values: Codes, limits: Thresholds) -> BoolArray:
    rests: BoolArray = (values >= limits.rests_above) | (values <= limits.rests_below)
    return rests
