"""What a sampled edge will be worth: the grid, noise over slew, levels and codes."""

from __future__ import annotations

import math

from benchtool.frozen import frozen_record
from benchtool.model.plan import Means

_REFERENCE = 0.2  # reference levels at 20 % and 80 % of the amplitude, as measuring takes them
_SEEN = 0.5  # samples between them from which edges are interpolated
_FITTED = 4.0  # samples between them from which a line is fitted
_PARABOLA = 1.5  # sd of a parabola's centre against that of a line: one-pole edges are curved
_CURVED = 0.23  # rms error of two points on a curved edge: Ts/√12·0.23/samples
_WIDER = 1.25  # range of a converter over the supply


@frozen_record
class Sampling:
    """Edges as the plan expects them.

    Attributes:
        step_s: Sample interval.
        resolved: Whether samples lie on the edges, so that they are interpolated.
        grid_s: Grid step that gives the error left by the grid.
        edge_u_s: Standard uncertainty of an edge from noise over slew.
        level_u_s: What level and code step give a width.
    """

    step_s: float
    resolved: bool = False
    grid_s: float = 0.0
    edge_u_s: float = 0.0
    level_u_s: float = 0.0


def sample_edges(means: Means, rate_hz: float, swing_v: float) -> Sampling:
    """Return what edges of a square output are worth at a rate.

    Args:
        means: Bits, noise and bandwidth.
        rate_hz: Samples a second.
        swing_v: Amplitude of the output, volts.

    References:
        A one-pole edge passes its middle with the slew π·B·A, and 20 % to 80 % in ln 4/(2π·B).
    """
    step_s = 1 / rate_hz
    if means.bandwidth_hz is None:
        return Sampling(step_s=step_s, grid_s=step_s)
    length = edge_length(means) / step_s
    if length <= _SEEN:
        return Sampling(step_s=step_s, grid_s=step_s)
    code_v = _WIDER * swing_v / 2**means.bits if means.bits else 0.0
    noise_v = max(means.noise_v, code_v / math.sqrt(12))
    slew = math.pi * means.bandwidth_hz * swing_v
    fitted = length >= _FITTED
    points = max(2, round(0.45 * length)) * 2 if fitted else 1.5
    reach_v = slew * step_s * (points if fitted else 1)
    codes = max(1.0, reach_v / code_v) if code_v else 1.0
    left = _undithered(means.noise_v, code_v) * code_v / math.sqrt(12) / math.sqrt(codes)
    return Sampling(
        step_s=step_s,
        resolved=True,
        grid_s=0.0 if fitted else step_s * min(1.0, _CURVED / length),
        edge_u_s=(_PARABOLA if fitted else 1.0) * noise_v / slew / math.sqrt(points),
        level_u_s=math.sqrt(2) * left / slew,
    )


def edge_length(means: Means) -> float:
    """Return how long an edge takes from 20 % to 80 %, seconds; 0 for edges within a sample."""
    if means.bandwidth_hz is None:
        return 0.0
    return math.log((1 - _REFERENCE) / _REFERENCE) / (2 * math.pi * means.bandwidth_hz)


def _undithered(noise_v: float, code_v: float) -> float:
    """Return how much of the rounding of codes is left under noise, 0 to 1."""
    return math.exp(-2 * (math.pi * noise_v / code_v) ** 2) if code_v else 0.0
