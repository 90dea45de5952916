"""Legs of a node that swings to and fro, or comes to a stand."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from benchtool.circuits import Prediction, Value
from benchtool.errors import UsageError
from benchtool.frozen import frozen_record
from benchtool.simulation.acquisition import Acquisition
from benchtool.simulation.legs import QUIET, Leg, Wave
from benchtool.simulation.pulls import Network, charge_legs, discharge_leg, end_of


@frozen_record(eq=False)
class Scene:
    """What the board is made of and how long the instrument looks on.

    Attributes:
        network: The timing node.
        prediction: Times of one cycle of it.
        acquisition: Start, jitter and trigger.
        wave: The ripple on the supply.
        span_s: Length of the record in true seconds.
    """

    network: Network
    prediction: Prediction
    acquisition: Acquisition
    wave: Wave
    span_s: float


def idle_leg(network: Network, until_s: float) -> Leg:
    """Return the node before the supply is switched on."""
    begin_s = min(-1.0, until_s - 1.0)
    tau_s = network.charge[0].tau_s
    return Leg(
        start_s=begin_s,
        duration_s=until_s - begin_s,
        settle_v=0.0,
        tau_s=tau_s,
        begin_v=0.0,
        output_high=False,
    )


def stuck_legs(network: Network, powered_s: float, wave: Wave) -> list[Leg]:
    """Return a node that rises, and perhaps turns once, and then stands still."""
    if math.isinf(powered_s):
        # long enough ago for the node to have settled
        powered_s = -60 * sum(pull.tau_s for pull in (*network.charge, network.discharge) if pull)
        return list(_from_rest(network, powered_s, wave))
    return [idle_leg(network, powered_s), *_from_rest(network, powered_s, wave)]


def _from_rest(network: Network, start_s: float, wave: Wave) -> Iterator[Leg]:
    """Yield legs from the step of the supply on, without end unless the node stands still."""
    return _alternate(network, network.start_v, start_s, wave)


def _alternate(network: Network, begin_v: float, start_s: float, wave: Wave) -> Iterator[Leg]:
    """Yield charge and discharge in turn, for as long as the node reaches its thresholds."""
    v, now_s = begin_v, start_s
    while True:
        leg = None
        for leg in charge_legs(network, v, now_s, wave):
            yield leg
        if leg is None or math.isinf(leg.duration_s):
            return
        v, now_s = end_of(leg, wave), leg.start_s + leg.duration_s
        leg = discharge_leg(network, v, now_s, wave)
        yield leg
        if math.isinf(leg.duration_s):
            return
        v, now_s = end_of(leg, wave), leg.start_s + leg.duration_s


def _until(legs: Iterator[Leg], end_s: float) -> list[Leg]:
    """Return legs up to the one that begins after ``end_s``."""
    found: list[Leg] = []
    for leg in legs:
        found.append(leg)
        if leg.start_s > end_s:
            break
    return found


def walk_cycles(scene: Scene, powered_s: float, rng: np.random.Generator) -> list[Leg]:
    """Return the legs one after the other: from power-up, or on a supply that ripples."""
    network, wave = scene.network, scene.wave
    period_s = seconds(scene.prediction.period)
    end_s = scene.span_s + 3 * period_s
    if math.isfinite(powered_s):
        walked = _until(_from_rest(network, powered_s, wave), end_s)
        return [idle_leg(network, powered_s), *_jittered(walked, scene, rng)]
    start_s = -period_s * (3 + float(rng.uniform()))
    return _until(_alternate(network, low_turn(network), start_s, wave), end_s)


def low_turn(network: Network) -> float:
    """Return the voltage inside the capacitor when the node turns to charge, without ripple."""
    pull = network.discharge
    if pull is None:
        return network.start_v
    at_lower = network.lower.v + (network.lower.v - pull.settle_v) * pull.esr_share
    return pull.inside_after(at_lower, 0.0, network.delay_lower_s, QUIET)


def repeat_cycle(scene: Scene, rng: np.random.Generator) -> list[Leg]:
    """Return the steady cycle over and over, from a random point of it on."""
    network, period_s = scene.network, seconds(scene.prediction.period)
    slack = 1 + 8 * scene.acquisition.jitter_rel
    n_cycles = math.ceil(scene.span_s / period_s * slack) + 4
    cycle = _first_cycles(_alternate(network, low_turn(network), 0.0, QUIET), 1)
    begin_s = -period_s * float(rng.uniform())
    copies = [
        replace(leg, start_s=begin_s + index * period_s + leg.start_s)
        for index in range(n_cycles)
        for leg in cycle
    ]
    return _jittered(copies, scene, rng)


def _jittered(legs: list[Leg], scene: Scene, rng: np.random.Generator) -> list[Leg]:
    """Stretch each interval of the output by its own random factor, the node with it.

    An interval's variance goes with its length, so that a period's is (jitter_rel·period)².
    """
    times, jitter_rel = scene.prediction, scene.acquisition.jitter_rel
    if jitter_rel == 0:
        return legs
    period_s = seconds(times.period)
    spread = {
        True: jitter_rel * math.sqrt(period_s / seconds(times.t_high)),
        False: jitter_rel * math.sqrt(period_s / seconds(times.t_low)),
    }
    stretched: list[Leg] = []
    now_s, factor, state = legs[0].start_s, 1.0, None
    for leg in legs:
        if leg.output_high is not state:
            state = leg.output_high
            factor = draw_stretch(spread[state], rng)
        duration_s = leg.duration_s * factor
        stretched.append(
            replace(leg, start_s=now_s, duration_s=duration_s, tau_s=leg.tau_s * factor)
        )
        now_s += duration_s
    return stretched


def draw_stretch(spread_rel: float, rng: np.random.Generator) -> float:
    """Return a random factor around 1.

    Raises:
        UsageError: If it would turn time back.
    """
    factor = 1 + spread_rel * float(rng.standard_normal())
    if factor <= 0:
        raise UsageError(
            f"an interval with a jitter of {spread_rel:.3g} of itself would end before it begins",
            hint="Take a smaller jitter.",
        )
    return factor


def divide_output(legs: list[Leg], divide: int, rng: np.random.Generator) -> list[Leg]:
    """Return legs whose output is that of a counter: high for half its cycles, rounded up."""
    if divide == 1:
        return legs
    count = int(rng.integers(divide))
    counted: list[Leg] = []
    was_high = False
    for leg in legs:
        if leg.output_high and not was_high:
            count = (count + 1) % divide
        was_high = leg.output_high
        counted.append(replace(leg, output_high=count < (divide + 1) // 2))
    return counted


def mean_intervals(network: Network, wave: Wave, n_cycles: int) -> tuple[float, float]:
    """Return mean high and low time over ``n_cycles`` on a rippling supply, seconds.

    The first four cycles are left to the ripple to settle.
    """
    legs = _alternate(network, low_turn(network), 0.0, wave)
    walked = _first_cycles(legs, n_cycles + 4)
    high_s = [leg.duration_s for leg in walked if leg.output_high]
    low_s = [leg.duration_s for leg in walked if not leg.output_high]
    legs_a_cycle = len(high_s) // (n_cycles + 4)
    return math.fsum(high_s[4 * legs_a_cycle :]) / n_cycles, math.fsum(low_s[4:]) / n_cycles


def _first_cycles(legs: Iterator[Leg], n_cycles: int) -> list[Leg]:
    """Return the legs of the first ``n_cycles`` whole cycles."""
    found: list[Leg] = []
    n_low = 0
    for leg in legs:
        found.append(leg)
        n_low += not leg.output_high
        if n_low == n_cycles:
            break
    return found


def seconds(value: Value | None) -> float:
    """Return a predicted time, NaN where the circuit has none."""
    return math.nan if value is None else float(value)
