"""Legs of a node that runs once: after a trigger, or after power-up."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from benchtool.circuits import Prediction
from benchtool.errors import UsageError
from benchtool.model.arrays import FloatArray
from benchtool.simulation.acquisition import Acquisition
from benchtool.simulation.legs import Leg, Wave
from benchtool.simulation.oscillation import Scene, draw_stretch, idle_leg, seconds
from benchtool.simulation.pulls import Network, charge_legs, end_of


def one_shot_legs(scene: Scene, rng: np.random.Generator) -> tuple[list[Leg], FloatArray]:
    """Trigger again and again; a trigger that comes while the output is high does nothing.

    Returns:
        The legs, and the begin of each trigger pulse.
    """
    every_s, _ = trigger_times(scene.prediction, scene.acquisition)
    first_s = every_s * (float(rng.uniform()) - 1)
    triggers_s = np.arange(first_s, scene.span_s + every_s, every_s)
    free_s = first_s - every_s
    legs = [_resting(scene.network, free_s)]
    for trigger_s in (float(value) for value in triggers_s):
        if trigger_s < free_s:
            continue
        pulse = _pulse(scene, trigger_s, rng)
        free_s = pulse[-1].start_s + pulse[-1].duration_s
        legs += pulse
        if math.isinf(free_s):
            break
        legs.append(_resting(scene.network, free_s, end_of(pulse[-1], scene.wave)))
    return legs, triggers_s


def trigger_times(prediction: Prediction, acquisition: Acquisition) -> tuple[float, float]:
    """Return repetition and length of a one-shot's trigger pulses, seconds.

    Raises:
        UsageError: If the pulse never ends and the acquisition does not say how often to trigger.
    """
    pulse_s = seconds(prediction.t_high)
    every_s = acquisition.trigger_every_s
    if every_s is None and not math.isfinite(pulse_s):
        raise UsageError(
            "the pulse of this one-shot never ends, so its trigger has no usual repetition",
            hint="Say how often it is triggered.",
        )
    every_s = 2 * pulse_s if every_s is None else every_s
    shortest_s = every_s if not math.isfinite(pulse_s) else min(every_s, pulse_s)
    width_s = acquisition.trigger_width_s
    return every_s, shortest_s / 20 if width_s is None else width_s


def _pulse(scene: Scene, trigger_s: float, rng: np.random.Generator) -> list[Leg]:
    network = scene.network
    legs = list(charge_legs(network, network.start_v, trigger_s, scene.wave))
    if not scene.acquisition.jitter_rel:
        return legs
    factor = draw_stretch(scene.acquisition.jitter_rel, rng)
    return [
        replace(leg, duration_s=leg.duration_s * factor, tau_s=leg.tau_s * factor) for leg in legs
    ]


def _resting(network: Network, start_s: float, begin_v: float | None = None) -> Leg:
    pull = network.discharge
    if pull is None:
        raise ValueError("this circuit has no switch that empties its capacitor")
    return Leg(
        start_s=start_s,
        duration_s=math.inf,
        settle_v=pull.settle_v,
        tau_s=pull.tau_s,
        begin_v=network.start_v if begin_v is None else begin_v,
        output_high=False,
    )


def power_on_legs(network: Network, powered_s: float, wave: Wave) -> list[Leg]:
    """Let the node rise; the output is low until it turns, and high from then on."""
    legs = list(charge_legs(network, network.start_v, powered_s, wave))
    legs = [replace(leg, output_high=False) for leg in legs]
    last = legs[-1]
    if math.isfinite(last.duration_s):
        turned_s = last.start_s + last.duration_s
        legs.append(
            replace(
                last,
                start_s=turned_s,
                duration_s=math.inf,
                begin_v=end_of(last, wave),
                output_high=True,
            )
        )
    return [idle_leg(network, powered_s), *legs]
