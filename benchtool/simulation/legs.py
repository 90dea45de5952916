"""The course of the timing node: one exponential after the other."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, FloatArray


@frozen_record
class Wave:
    """A ripple as it runs: sin(omega·t + phase), with its share of the supply.

    Attributes:
        depth_rel: Amplitude as a share of the supply.
        omega_per_s: Angular frequency.
        phase_rad: Phase at time 0.
    """

    depth_rel: float
    omega_per_s: float
    phase_rad: float

    def at(self, times_s: FloatArray, lag_rad: FloatArray | float = 0.0) -> FloatArray:
        """Return the sine, between -1 and 1, at ``times_s``."""
        value: FloatArray = np.sin(self.omega_per_s * times_s + (self.phase_rad - lag_rad))
        return value

    def value(self, time_s: float, lag_rad: float = 0.0) -> float:
        """Return the sine, between -1 and 1, at one time."""
        return math.sin(self.omega_per_s * time_s + self.phase_rad - lag_rad)


QUIET = Wave(depth_rel=0.0, omega_per_s=0.0, phase_rad=0.0)
"""No ripple."""


@frozen_record
class Leg:
    """One exponential of the voltage inside the capacitor.

    Attributes:
        start_s: When it begins, true seconds after the first sample.
        duration_s: How long it lasts; ``inf`` for a node that stands still.
        settle_v: Where it tends to, volts.
        tau_s: Its time constant.
        begin_v: Voltage inside the capacitor when it begins.
        esr_share: Series resistance of the capacitor as a share of the driving resistance.
        output_high: State of the output.
        swing_v: Amplitude by which a ripple of the supply moves ``settle_v``.
    """

    start_s: float
    duration_s: float
    settle_v: float
    tau_s: float
    begin_v: float
    esr_share: float = 0.0
    output_high: bool
    swing_v: float = 0.0


@frozen_record(eq=False)
class Legs:
    """Legs in order as columns, each of shape (n,); see ``Leg``."""

    start_s: FloatArray
    settle_v: FloatArray
    tau_s: FloatArray
    begin_v: FloatArray
    esr_share: FloatArray
    output_high: BoolArray
    swing_v: FloatArray

    def node_v(self, times_s: FloatArray, wave: Wave | None) -> FloatArray:
        """Return the voltage of the timing node at ``times_s``, volts, shape as ``times_s``.

        References:
            v = V + (v0 - V)·e^(-t/tau); a sine on V adds its steady response, smaller by
            √(1 + (omega·tau)²) and later by atan(omega·tau).
        """
        leg = self._leg_of(times_s)
        settled, share = self.settle_v[leg], self.esr_share[leg]
        steady_now, steady_then, pull = settled, settled, settled
        if wave is not None:
            lag = np.arctan(wave.omega_per_s * self.tau_s)[leg]
            swing = (self.swing_v / np.hypot(1.0, wave.omega_per_s * self.tau_s))[leg]
            steady_now = settled + swing * wave.at(times_s, lag)
            steady_then = settled + swing * wave.at(self.start_s[leg], lag)
            pull = settled + self.swing_v[leg] * wave.at(times_s)
        decay = np.exp(-(times_s - self.start_s[leg]) / self.tau_s[leg])
        inside = steady_now + (self.begin_v[leg] - steady_then) * decay
        node: FloatArray = (inside + pull * share) / (1.0 + share)
        return node

    def _leg_of(self, times_s: FloatArray) -> np.ndarray[tuple[int], np.dtype[np.intp]]:
        found = np.searchsorted(self.start_s, times_s, side="right") - 1
        return np.maximum(found, 0)


def stack_legs(legs: Sequence[Leg]) -> Legs:
    """Return legs as columns."""
    rows = [leg for leg in legs if leg.duration_s > 0]
    return Legs(
        start_s=np.array([leg.start_s for leg in rows]),
        settle_v=np.array([leg.settle_v for leg in rows]),
        tau_s=np.array([leg.tau_s for leg in rows]),
        begin_v=np.array([leg.begin_v for leg in rows]),
        esr_share=np.array([leg.esr_share for leg in rows]),
        output_high=np.array([leg.output_high for leg in rows], dtype=bool),
        swing_v=np.array([leg.swing_v for leg in rows]),
    )
