"""Whether U covers the truth as often as it says, over simulated captures."""

from __future__ import annotations

import math
from collections import Counter

import numpy as np

from benchtool.circuits import Circuit
from benchtool.frozen import frozen_record
from benchtool.model.capture import Capture, Waveform
from benchtool.model.quantity import Measured
from benchtool.model.timing import Timing
from benchtool.selftest.checks import SelfCheck
from benchtool.simulation import Acquisition, Truth, simulate
from benchtool.timing import find_edges, find_intervals, find_levels, measure_timing
from benchtool.uncertainty import COVERAGE, expanded

QUANTITIES = ("t_high", "t_low", "period", "frequency", "duty")
TIMEBASE_REL = 50e-6
_SEED = 20_310_302


@frozen_record
class _Bench:
    """One way of looking at the board."""

    name: str
    periods: float
    samples_a_period: float
    jitter_rel: float
    noise_rel: float
    bits: int | None
    bandwidth_share: float | None


_BENCHES = (
    _Bench(
        name="few periods",
        periods=6.6,
        samples_a_period=400,
        jitter_rel=1e-3,
        noise_rel=0.01,
        bits=8,
        bandwidth_share=40,
    ),
    _Bench(
        name="many periods",
        periods=60.3,
        samples_a_period=60,
        jitter_rel=2e-3,
        noise_rel=0.01,
        bits=8,
        bandwidth_share=10,
    ),
    _Bench(
        name="square edges on a coarse grid",
        periods=40.7,
        samples_a_period=53.3,
        jitter_rel=1e-3,
        noise_rel=0.005,
        bits=8,
        bandwidth_share=None,
    ),
    _Bench(
        name="slow edges",
        periods=25.4,
        samples_a_period=120,
        jitter_rel=5e-4,
        noise_rel=0.005,
        bits=10,
        bandwidth_share=12,
    ),
)
_BOARD = Circuit(
    topology="astable",
    RA=100e3,
    RB=330e3,
    C=47e-9,
    supply=12.0,
    v_upper=8.0,
    v_lower=4.0,
    family="cmos",
)


def check_coverage(n_captures: int) -> tuple[SelfCheck, ...]:
    """Count how often U covers the truth.

    Args:
        n_captures: Simulated captures, shared equally among four ways of looking; 1,000 say
            something.

    Returns:
        One line for each way of looking, with its worst quantity. A line holds where the share
        covered is no more than three standard deviations of the count below the stated one.
    """
    rng = np.random.default_rng(_SEED)
    n_each = max(1, n_captures // len(_BENCHES))
    return tuple(_check(bench, n_each, rng) for bench in _BENCHES)


def _check(bench: _Bench, n_captures: int, rng: np.random.Generator) -> SelfCheck:
    covered: Counter[str] = Counter(dict.fromkeys(QUANTITIES, 0))
    for _ in range(n_captures):
        capture, truth = simulate(_BOARD, _acquisition(bench, rng), rng)
        timing = _measure(capture)
        covered.update(name for name in QUANTITIES if _covers(timing, truth, name))
    worst = min(QUANTITIES, key=lambda name: covered[name])
    share = covered[worst] / n_captures
    limit = COVERAGE - 3 * math.sqrt(COVERAGE * (1 - COVERAGE) / n_captures)
    return SelfCheck(
        name=f"coverage: {bench.name}",
        found=share,
        limit=limit,
        ok=share >= limit,
        text=f"U of the worst quantity, {worst}, covered the truth in {covered[worst]} of "
        f"{n_captures} simulated captures; {limit:.3f} of them must be, for a stated "
        f"{COVERAGE:.0%}",
    )


def _acquisition(bench: _Bench, rng: np.random.Generator) -> Acquisition:
    period_s = math.log(2) * (100e3 + 2 * 330e3) * 47e-9
    # the grid must not stand still against the board from capture to capture
    rate_hz = bench.samples_a_period / period_s * float(rng.uniform(0.9, 1.1))
    share = bench.bandwidth_share
    return Acquisition(
        rate_hz=rate_hz,
        periods=bench.periods,
        bits=bench.bits,
        noise_v=bench.noise_rel * 12.0,
        bandwidth_hz=None if share is None else share / period_s,
        timebase_rel=float(rng.uniform(-TIMEBASE_REL, TIMEBASE_REL)),
        jitter_rel=bench.jitter_rel,
    )


def _measure(capture: Capture) -> Timing:
    trace = capture.traces[0]
    if not isinstance(trace, Waveform):
        raise TypeError("coverage is counted on waveforms")
    levels = find_levels(trace)
    edges = find_edges(trace, levels)
    intervals = find_intervals(edges, active="high")
    return measure_timing(intervals, edges, timebase_rel=TIMEBASE_REL)


def _covers(timing: Timing, truth: Truth, quantity: str) -> bool:
    measured, true = getattr(timing, quantity), getattr(truth, quantity)
    if not isinstance(measured, Measured):
        return False
    return bool(abs(measured.value - true) <= expanded(measured))
