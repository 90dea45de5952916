"""Profiles: slopes of one kind laid over each other and averaged in bins."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import FloatArray
from benchtool.node.slopes import Points, Slope

MOST_PROFILES = 6
"""Profiles of each kind, from successive parts of the record: their scatter tells the noise."""

_MOST_BINS = 32
_LEAST_BINS = 6
_SHORTEST = 0.7  # of the longest slope: shorter ones are no slopes of the same kind


@frozen_record(eq=False)
class Profile:
    """Mean course of some slopes of one kind after their turn.

    Attributes:
        rises: Whether it rises.
        times_s: After the turn, mean of each bin, shape (m,).
        volts: Mean of each bin, shape (m,).
        places: Number of each bin, shape (m,).
        counts: Samples in each, shape (m,).
        length_s: From turn to turn.
        n_slopes: Slopes in it.
        part: Number of the part of the record that they come from.
    """

    rises: bool
    times_s: FloatArray
    volts: FloatArray
    places: FloatArray
    counts: FloatArray
    length_s: float
    n_slopes: int
    part: int


def make_profiles(
    points: Points, slopes: Sequence[Slope], margin_rel: float
) -> tuple[Profile, ...]:
    """Return profiles of the rises, then of the falls.

    Whole slopes only, unless there is none: then those that the ends of the record cut.

    Args:
        points: The samples.
        slopes: All slopes.
        margin_rel: Part of a slope beside each turn that is left out.
    """
    made: list[Profile] = []
    for rises in (True, False):
        alike = [slope for slope in slopes if slope.rises is rises]
        whole = _usual([slope for slope in alike if slope.is_whole])
        n_groups = min(len(whole), MOST_PROFILES)
        groups = [
            whole[i * len(whole) // n_groups : (i + 1) * len(whole) // n_groups]
            for i in range(n_groups)
        ] or [[slope] for slope in alike]
        profiles = [_profile(points, group, margin_rel, part) for part, group in enumerate(groups)]
        made += [profile for profile in profiles if profile is not None]
    return tuple(made)


def _usual(slopes: list[Slope]) -> list[Slope]:
    longest = max((slope.end_s - slope.begin_s for slope in slopes), default=0.0)
    middle_s = float(np.median([s.end_s - s.begin_s for s in slopes])) if slopes else longest
    return [
        slope
        for slope in slopes
        if _SHORTEST * middle_s <= slope.end_s - slope.begin_s <= middle_s / _SHORTEST
    ]


def _profile(points: Points, group: list[Slope], margin_rel: float, part: int) -> Profile | None:
    length_s = min(slope.end_s - slope.begin_s for slope in group)
    margin_s = max(margin_rel * length_s, 1.01 * points.step_s)
    low_s = margin_s if group[0].begins else 0.0
    high_s = length_s - margin_s if group[0].ends else length_s
    rows = np.concatenate([np.arange(slope.first, slope.stop) for slope in group])
    begins = np.repeat(
        [slope.begin_s for slope in group], [slope.stop - slope.first for slope in group]
    )
    after_s, volts = points.times_s[rows] - begins, points.volts[rows]
    inside = (after_s >= low_s) & (after_s <= high_s)
    n_inside = int(np.count_nonzero(inside))
    if n_inside < _LEAST_BINS or high_s <= low_s:
        return None
    n_bins = min(_MOST_BINS, max(_LEAST_BINS, n_inside // 4))
    after_s, volts = after_s[inside], volts[inside]
    bins = np.minimum(((after_s - low_s) / (high_s - low_s) * n_bins).astype(np.intp), n_bins - 1)
    counts = np.bincount(bins, minlength=n_bins).astype(np.float64)
    held = counts > 0
    if np.count_nonzero(held) < _LEAST_BINS:
        return None
    return Profile(
        rises=group[0].rises,
        times_s=np.bincount(bins, after_s, n_bins)[held] / counts[held],
        volts=np.bincount(bins, volts, n_bins)[held] / counts[held],
        places=np.flatnonzero(held).astype(np.float64),
        counts=counts[held],
        length_s=length_s,
        n_slopes=len(group),
        part=part,
    )
