"""Captures of the greenhouse misting controller (invented), made with numpy and nothing of ours.

The spacing stage: RA 100k, RB 330k, C 47 µF, CMOS timer, 12 V; an ideal astable has
t_high = (RA+RB)·C·ln 2 and t_low = RB·C·ln 2.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

RA_OHM, RB_OHM, C_F = 100e3, 330e3, 47e-6
T_HIGH_S = (RA_OHM + RB_OHM) * C_F * math.log(2)  # 14.009 s
T_LOW_S = RB_OHM * C_F * math.log(2)  # 10.751 s
PERIOD_S = T_HIGH_S + T_LOW_S

HEAD = """\
schema = 1

[board]
name = "Mist valve timer"
assembly = "GH-MV-07"
revision = "C"
supply = "12 V 5%"
"""
PARTS = """\
RA = "100k 1%"
RB = "330k 1%"
C = { value = "47u", tolerance = "10%", kind = "electrolytic", leakage = "0.5 uA" }
ic = "cmos"
"""
SPACING = f"""
[stage.spacing]
topology = "astable"
channel = "OUT"
{PARTS}
[stage.spacing.limits]
derive = "worst-case"
quantities = ["t_high", "t_low", "duty"]
period = {{ lower = "22 s", upper = "28 s", source = "drawing GH-MV-07 sheet 4" }}
"""
DESIGN = HEAD + SPACING

Floats = NDArray[np.float64]


def square_edges(
    n_periods: int,
    *,
    t_high_s: float = T_HIGH_S,
    t_low_s: float = T_LOW_S,
    first_s: float = 3.0,
    jitter_s: float = 0.0,
    seed: int = 1,
) -> Floats:
    """Return rising and falling edge times in turn; each width scatters on its own."""
    widths = np.tile([t_high_s, t_low_s], n_periods)
    widths = widths + np.random.default_rng(seed).normal(0, jitter_s, widths.size)
    return np.concatenate([[first_s], first_s + np.cumsum(widths)])


def square_v(
    times_s: Floats, edges_s: Floats, *, low_v: float = 0.0, high_v: float = 12.0
) -> Floats:
    """Return volts at times: low before the first edge, then high and low in turn."""
    is_high = np.searchsorted(edges_s, times_s, side="right") % 2 == 1
    return np.where(is_high, high_v, low_v)


def node_v(times_s: Floats, edges_s: Floats, *, supply_v: float = 12.0) -> Floats:
    """Return the capacitor node's volts: up to 2/3 of the supply while high, down to 1/3."""
    index = np.clip(np.searchsorted(edges_s, times_s, side="right") - 1, 0, edges_s.size - 2)
    share = (times_s - edges_s[index]) / np.diff(edges_s)[index]
    fall = 2.0 ** -np.clip(share, 0, 1)  # from 1 to 1/2, as from 2/3 to 1/3
    rising = index % 2 == 0
    return np.where(rising, supply_v * (1 - 2 / 3 * fall), supply_v * 2 / 3 * fall)


def sample_times(n_samples: int = 3000, dt_s: float = 0.05) -> Floats:
    """Return evenly spaced times; 3000 of 50 ms hold six periods of the spacing stage."""
    return np.arange(n_samples) * dt_s


def write_columns(path: Path, times_s: Floats, columns: Mapping[str, Floats]) -> Path:
    """Write a delimited text file with a header, seconds and volts."""
    head = ",".join(["Time (s)", *(f"{name} (V)" for name in columns)])
    table = np.column_stack([times_s, *columns.values()])
    np.savetxt(path, table, delimiter=",", header=head, comments="", fmt="%.6g", encoding="utf-8")
    return path


def write_square(
    path: Path,
    *,
    t_high_s: float = T_HIGH_S,
    t_low_s: float = T_LOW_S,
    n_samples: int = 3000,
    dt_s: float = 0.05,
    first_s: float = 3.0,
    jitter_s: float = 0.02,
    seed: int = 1,
    channel: str = "OUT",
) -> Path:
    """Write a capture of one output."""
    times_s = sample_times(n_samples, dt_s)
    n_periods = math.ceil(times_s[-1] / (t_high_s + t_low_s)) + 1
    edges_s = square_edges(
        n_periods,
        t_high_s=t_high_s,
        t_low_s=t_low_s,
        first_s=first_s,
        jitter_s=jitter_s,
        seed=seed,
    )
    return write_columns(path, times_s, {channel: square_v(times_s, edges_s)})


def write_flat(path: Path, level_v: float, *, n_samples: int = 1500, dt_s: float = 0.05) -> Path:
    """Write a capture of an output that never changes; a little noise, as an instrument adds."""
    times_s = sample_times(n_samples, dt_s)
    noise_v = np.random.default_rng(2).normal(0, 0.01, times_s.size)
    return write_columns(path, times_s, {"OUT": level_v + noise_v})
