"""The misting controller's node, by the model of the simulation and by an integrator of its own."""

from __future__ import annotations

import math

import numpy as np
from scipy.integrate import solve_ivp
from scipy.signal import lfilter

from benchtool.circuits import Circuit
from benchtool.model.capture import ArraySamples, Span, UniformTime, Waveform
from benchtool.model.quantity import Measured
from benchtool.simulation import Acquisition, simulate

RA, RB, C, SUPPLY = 100e3, 330e3, 47e-6, 12.0
FAST = 1e-4
"""Scale of the capacitor in the fast board: 2.4 ms in place of 24.7 s."""


def board(scale: float = 1.0, **changes: float) -> Circuit:
    """Return the misting controller, its capacitor scaled."""
    figures = {
        "RA": RA,
        "RB": RB,
        "C": C * scale,
        "supply": SUPPLY,
        "v_upper": SUPPLY * 2 / 3,
        "v_lower": SUPPLY / 3,
        "r_on": 9.0,
    }
    return Circuit(topology="astable", **{**figures, **changes})


def as_node(volts: np.ndarray, dt_s: float) -> Waveform:
    """Return volts as the waveform of a node."""
    return Waveform(
        samples=ArraySamples(volts),
        time=UniformTime(dt_s=dt_s),
        spans=(Span(start=0, stop=volts.size, start_s=0.0),),
        channel="NODE",
    )


def recorded(circuit: Circuit, periods: float, n: int = 20_000, seed: int = 0, **how) -> Waveform:
    """Return a simulated record of the node of ``n`` samples over some nominal periods."""
    period_s = (circuit.RA + 2 * circuit.RB) * circuit.C * math.log(2)
    span_s = periods * period_s
    acquisition = Acquisition(
        rate_hz=n / span_s, duration_s=span_s, record=("capacitor",), **{"noise_v": 0.01, **how}
    )
    capture, _ = simulate(circuit, acquisition, np.random.default_rng(seed))
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    return trace


def remembering(rng: np.random.Generator, n: int, sd: float, length: float) -> np.ndarray:
    """Return Gaussian noise whose correlation falls as e^(-i/length)."""
    kept = math.exp(-1 / length)
    fresh = rng.normal(0, sd * math.sqrt(1 - kept**2), n)
    fresh[0] = rng.normal(0, sd)
    return lfilter([1.0], [1.0, -kept], fresh)


def with_noise(trace: Waveform, noise: np.ndarray) -> Waveform:
    """Return a waveform with more noise."""
    volts = np.concatenate(list(trace.samples.blocks())) * trace.scale.gain + trace.scale.offset
    assert isinstance(trace.time, UniformTime)
    return as_node(volts + noise, trace.time.dt_s)


def volts(value: float, u: float = 0.0) -> Measured:
    return Measured(value=value, u=u, unit="V")


def seconds(value: float, u: float = 0.0) -> Measured:
    return Measured(value=value, u=u, unit="s")


def ohms(value: float, u: float = 0.0) -> Measured:
    return Measured(value=value, u=u, unit="ohm")


def integrated(
    n_cycles: int,
    n: int = 20_000,
    *,
    bow_per_v: float = 0.0,
    branch_share: float = 0.0,
    branch_s: float = 1.0,
    esr_ohm: float = 0.0,
    leak_ohm: float = math.inf,
    noise_v: float = 0.005,
    seed: int = 0,
) -> Waveform:
    """Return the node of the fast board by Kirchhoff's current law, integrated.

    Args:
        n_cycles: Cycles in the record, after three that settle what the branch remembers.
        n: Samples.
        bow_per_v: Relative change of the capacitance a volt, around half the supply.
        branch_share: Capacitance of a branch R-C across the capacitor, as a share of it.
        branch_s: Time constant of that branch.
        esr_ohm: Series resistance of the capacitor.
        leak_ohm: Leak from the node to 0 V.
        noise_v: White noise of a sample.
        seed: Of the noise.
    """
    farad = C * FAST
    branch_ohm = branch_s / (branch_share * farad) if branch_share else math.inf
    usual_s = (RA + 2 * RB) * farad * math.log(2)
    span_s = usual_s * (n_cycles + 3)
    times = np.linspace(0, span_s, round(n * (n_cycles + 3) / n_cycles))
    shown = np.empty(times.size)

    def node(y: np.ndarray, charging: bool) -> tuple[float, float]:
        """Return the node's voltage and the current into the capacitor."""
        drive_v, drive_ohm = (SUPPLY, RA + RB) if charging else (0.0, RB)
        leaving = 1 / drive_ohm + 1 / leak_ohm + 1 / branch_ohm
        coming = drive_v / drive_ohm + y[1] / branch_ohm
        if not esr_ohm:
            return y[0], coming - leaving * y[0]
        v = (coming + y[0] / esr_ohm) / (leaving + 1 / esr_ohm)
        return v, (v - y[0]) / esr_ohm

    def slope(_: float, y: np.ndarray, charging: bool) -> list[float]:
        v, into = node(y, charging)
        held = farad * (1 + bow_per_v * (y[0] - SUPPLY / 2))
        return [into / held, (v - y[1]) / branch_s if branch_share else 0.0]

    now_s, y, charging = 0.0, [0.0, 0.0], True
    while now_s < span_s:
        goal = SUPPLY * (2 / 3 if charging else 1 / 3)

        def crossed(_: float, y: np.ndarray, charging: bool, goal: float = goal) -> float:
            return node(y, charging)[0] - goal

        crossed.terminal = True
        crossed.direction = 1 if charging else -1
        leg = solve_ivp(
            slope,
            (now_s, 2 * span_s),
            y,
            args=(charging,),
            events=crossed,
            dense_output=True,
            method="DOP853",
            rtol=1e-10,
            atol=1e-12,
            max_step=usual_s / 30,
        )
        inside = (times >= now_s) & (times < leg.t[-1])
        shown[inside] = [node(state, charging)[0] for state in leg.sol(times[inside]).T]
        now_s, y, charging = float(leg.t[-1]), list(leg.y[:, -1]), not charging
    kept = shown[times > span_s * 3 / (n_cycles + 3)]
    rng = np.random.default_rng(seed)
    return as_node(kept + rng.normal(0, noise_v, kept.size), float(times[1]))
