"""Truth for the sample captures: Kirchhoff's current law at the timing node, integrated.

Knows nothing of the circuit model: parts and thresholds are written out, scipy's integrator finds
the crossings.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.integrate import solve_ivp

Rate = Callable[[float, np.ndarray], list[float]]


@dataclass(frozen=True, kw_only=True)
class Astable:
    """The spacing stage of one board. A CMOS switch of about 8.7 ohm at 12 V."""

    C: float = 47e-6
    RA: float = 100e3
    RB: float = 330e3
    supply: float = 12.0
    r_on: float = 8.7
    shunt: float = math.inf
    ripple: float = 0.0
    ripple_hz: float = 100.0

    def rail(self, t: float) -> float:
        """Return the supply, volts."""
        return self.supply * (1 + self.ripple * math.sin(2 * math.pi * self.ripple_hz * t))

    def charge(self, t: float, v: np.ndarray) -> list[float]:
        """Return dv/dt while the switch is open, V/s."""
        return [((self.rail(t) - v[0]) / (self.RA + self.RB) - v[0] / self.shunt) / self.C]

    def discharge(self, t: float, v: np.ndarray) -> list[float]:
        """Return dv/dt while the switch is closed, V/s."""
        pin = (self.rail(t) / self.RA + v[0] / self.RB) / (
            1 / self.RA + 1 / self.RB + 1 / self.r_on
        )
        return [((pin - v[0]) / self.RB - v[0] / self.shunt) / self.C]

    def times(self) -> dict[str, float]:
        """Return first high, high and low time, seconds.

        On a rippling supply the latter two vary from cycle to cycle by up to a period of the
        ripple, and the first high is left out.
        """
        if self.ripple:
            end, v = self._up(0.0, self.supply * 0.6)
            return self._cycle(end, v)
        first_high, v = self._up(0.0, 0.0)
        return {"first_high": first_high, **self._cycle(first_high, v)}

    def _cycle(self, begin: float, v: float) -> dict[str, float]:
        turned, v = self._down(begin, v)
        end, _ = self._up(turned, v)
        return {"t_high": end - turned, "t_low": turned - begin}

    def _up(self, t: float, v: float) -> tuple[float, float]:
        nearest_v = self.supply * 2 / 3 * (1 - self.ripple)
        t, v = _integrate(self.charge, t, v, lambda _: nearest_v - 0.01, math.inf)
        return _integrate(self.charge, t, v, lambda s: self.rail(s) * 2 / 3, self._fine_s())

    def _down(self, t: float, v: float) -> tuple[float, float]:
        nearest_v = self.supply / 3 * (1 + self.ripple)
        t, v = _integrate(self.discharge, t, v, lambda _: nearest_v + 0.01, math.inf)
        return _integrate(self.discharge, t, v, lambda s: self.rail(s) / 3, self._fine_s())

    def _fine_s(self) -> float:
        """Return a step that misses no crest of the ripple."""
        return 1 / self.ripple_hz / 200 if self.ripple else math.inf


@dataclass(frozen=True, kw_only=True)
class OneShot:
    """The pulse stage of one board."""

    R: float = 68e3
    C: float = 47e-6
    supply: float = 12.0
    r_on: float = 8.7

    def times(self) -> dict[str, float]:
        """Return the pulse, seconds."""
        at_rest = self.supply * self.r_on / (self.R + self.r_on)
        pulse, _ = _integrate(
            lambda _, v: [(self.supply - v[0]) / self.R / self.C],
            0.0,
            at_rest,
            lambda _: self.supply * 2 / 3,
        )
        return {"t_high": pulse}


@dataclass(frozen=True, kw_only=True)
class Schmitt:
    """The heartbeat stage of one board."""

    R: float = 470e3
    C: float = 2.2e-6
    supply: float = 12.0
    upper: float = 0.58
    lower: float = 0.38

    def times(self) -> dict[str, float]:
        """Return high and low time, seconds."""

        def rate_to(rail: float) -> Rate:
            return lambda _, v: [(rail - v[0]) / self.R / self.C]

        upper, lower = self.upper * self.supply, self.lower * self.supply
        high, _ = _integrate(rate_to(self.supply), 0.0, lower, lambda _: upper)
        low, _ = _integrate(rate_to(0.0), 0.0, upper, lambda _: lower)
        return {"t_high": high, "t_low": low}


def _integrate(
    rate: Rate,
    start_s: float,
    start_v: float,
    goal: Callable[[float], float],
    step_s: float = math.inf,
) -> tuple[float, float]:
    """Integrate from a voltage to the first meeting with ``goal``; return its time and voltage."""

    def gap(t: float, v: np.ndarray) -> float:
        return float(v[0] - goal(t))

    begin = gap(start_s, np.array([start_v]))
    if begin == 0 or (begin > 0) == (rate(start_s, np.array([start_v]))[0] > 0):
        return start_s, start_v  # beyond it already
    gap.terminal = True  # type: ignore[attr-defined]
    solved = solve_ivp(
        rate,
        (start_s, start_s + 200.0),
        [start_v],
        method="DOP853",
        rtol=1e-8,
        atol=1e-9,
        events=gap,
        max_step=step_s,
    )
    assert solved.t_events[0].size == 1, "the node never meets its goal"
    return float(solved.t[-1]), float(solved.y[0][-1])
