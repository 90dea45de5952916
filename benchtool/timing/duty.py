"""The duty: high time over the time of the same whole cycles."""

from __future__ import annotations

import math

import numpy as np

from benchtool.model.arrays import FloatArray
from benchtool.model.quantity import Contribution, Measured
from benchtool.timing.budget import (
    Setting,
    grid_error,
    level_error,
    most_scatter,
    usual_edge_noise,
    width_grid,
    with_floor,
)
from benchtool.timing.scatter import ENOUGH, mean_of_widths, mean_on_grid
from benchtool.uncertainty import combine


def measure_duty(setting: Setting) -> Measured | None:
    """Return Σ high / Σ (high + low) over whole cycles."""
    high_s, low_s = setting.intervals.cycle_high_s, setting.intervals.cycle_low_s
    if not high_s.size:
        return None
    whole_s = float(np.mean(high_s + low_s))
    duty = float(np.mean(high_s)) / whole_s
    own = _scatter_and_grid(setting, duty, whole_s)
    return combine(duty, "1", [*own, level_error(setting, 1 / whole_s)], n=high_s.size)


def _scatter_and_grid(setting: Setting, duty: float, whole_s: float) -> list[Contribution]:
    high_s, low_s = setting.intervals.cycle_high_s, setting.intervals.cycle_low_s
    n, step_s = high_s.size, setting.edges.step_s
    floor_s = width_grid(setting, n)
    if setting.edges.resolved or n < ENOUGH or step_s == 0:
        own = _scatter(setting, high_s, low_s, duty, whole_s)
        return with_floor(setting, own, floor_s / whole_s, n)
    most_s = most_scatter(setting)
    high, low = (mean_on_grid(width_s, step_s, floor_s, most_s) for width_s in (high_s, low_s))
    shared_s2 = min(_shared_edge_variance(high_s, low_s) - step_s**2 / 12, most_s**2)
    alike = 2 * math.sqrt(duty * (1 - duty) * max(0.0, shared_s2) / n)
    u = math.hypot((1 - duty) * high.u, duty * low.u, alike) / whole_s
    scatter = Contribution(source="scatter", u=u, dof=min(high.dof, low.dof), note=high.note)
    return [scatter, grid_error(floor_s / whole_s)]


def _scatter(
    setting: Setting, high_s: FloatArray, low_s: FloatArray, duty: float, whole_s: float
) -> list[Contribution]:
    """Return the scatter of the ratio of two means, by its residuals high - duty·period."""
    if high_s.size == 1:
        return _single(setting, duty, whole_s)
    residual = high_s - duty * (high_s + low_s)
    mean = mean_of_widths(residual, duty * (1 - duty) * _shared_edge_variance(high_s, low_s))
    return [Contribution(source="scatter", u=mean.u / whole_s, dof=mean.dof, note=mean.note)]


def _shared_edge_variance(high_s: FloatArray, low_s: FloatArray) -> float:
    """Return the variance of an edge's noise, which neighbours share with opposite signs.

    Taking out the means takes (2n - 1)/n² of it along, which is put back.
    """
    n = high_s.size
    high, low = high_s - np.mean(high_s), low_s - np.mean(low_s)
    shared = float(high @ low) + float(low[:-1] @ high[1:])
    left = 1 - (2 * n - 1) / n**2
    return max(0.0, -shared / ((2 * n - 1) * left))


def _single(setting: Setting, duty: float, whole_s: float) -> list[Contribution]:
    """Return the budget of one cycle: three edges weigh 1, 1 - duty and duty."""
    jitter = setting.jitter_rel / math.sqrt(3) * duty * (1 - duty) * math.sqrt(2)
    edges = usual_edge_noise(setting) * math.sqrt(1 + duty**2 + (1 - duty) ** 2) / whole_s
    return [
        Contribution(source="assumed jitter", u=jitter, note="of high and low, rectangular"),
        Contribution(source="edge noise", u=edges, note="noise over slew, three edges"),
    ]
