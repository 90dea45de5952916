"""What the board does while the instrument looks on: legs of the node and edges of the output."""

from __future__ import annotations

import math
from dataclasses import replace
from itertools import pairwise

import numpy as np

from benchtool.circuits import Circuit, Prediction, find_topology
from benchtool.errors import UsageError
from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray, FloatArray
from benchtool.simulation.acquisition import Acquisition
from benchtool.simulation.legs import QUIET, Leg, Legs, Wave, stack_legs
from benchtool.simulation.oscillation import (
    Scene,
    divide_output,
    repeat_cycle,
    stuck_legs,
    walk_cycles,
)
from benchtool.simulation.pulls import build_network
from benchtool.simulation.single_run import one_shot_legs, power_on_legs, trigger_times


@frozen_record(eq=False)
class Course:
    """What happens on the board, in true seconds after the first sample.

    Attributes:
        circuit: The board.
        legs: Its timing node.
        edges_s: Times at which the output changes, shape (n,), from before the record to after.
        edge_high: State of the output after each, shape (n,).
        starts_high: State of the output before the first of them.
        powered_s: When the supply is switched on; ``-inf`` where it was on before.
        triggers_s: Begin of each trigger pulse, shape (m,).
        trigger_width_s: Length of a trigger pulse.
        wave: The ripple on the supply.
    """

    circuit: Circuit
    legs: Legs
    edges_s: FloatArray
    edge_high: BoolArray
    starts_high: bool
    powered_s: float
    triggers_s: FloatArray
    trigger_width_s: float
    wave: Wave


def run_course(
    circuit: Circuit,
    prediction: Prediction,
    acquisition: Acquisition,
    span_s: float,
    rng: np.random.Generator,
) -> Course:
    """Return what the board does over ``span_s`` true seconds.

    Args:
        circuit: The circuit, all floats.
        prediction: Its times, for one cycle of the node.
        acquisition: Start, jitter, ripple and trigger.
        span_s: Length of the record.
        rng: Draws phase and jitter.

    Raises:
        UsageError: If what is asked for is not simulated.
    """
    wave = _draw_wave(acquisition, rng)
    scene = Scene(
        network=build_network(circuit, wave.depth_rel),
        prediction=prediction,
        acquisition=acquisition,
        wave=wave,
        span_s=span_s,
    )
    if find_topology(circuit.topology).run == "t_high":
        legs, triggers_s = one_shot_legs(scene, rng)
        _, width_s = trigger_times(prediction, acquisition)
        course = _course(circuit, legs, -math.inf, wave)
        return replace(course, triggers_s=triggers_s, trigger_width_s=width_s)
    powered_s = _powered_s(circuit, acquisition, span_s)
    legs = divide_output(_free_run(circuit, scene, powered_s, rng), circuit.divide, rng)
    return _course(circuit, legs, powered_s, wave)


def _free_run(
    circuit: Circuit, scene: Scene, powered_s: float, rng: np.random.Generator
) -> list[Leg]:
    if find_topology(circuit.topology).run == "delay":
        return power_on_legs(scene.network, powered_s, scene.wave)
    if scene.prediction.stuck is not None:
        return stuck_legs(scene.network, powered_s, scene.wave)
    if scene.wave.depth_rel or scene.acquisition.start_up:
        return walk_cycles(scene, powered_s, rng)
    return repeat_cycle(scene, rng)


def _draw_wave(acquisition: Acquisition, rng: np.random.Generator) -> Wave:
    ripple = acquisition.ripple
    if ripple is None or ripple.depth_rel == 0:
        return QUIET
    if acquisition.jitter_rel:
        raise UsageError(
            "a ripple and an oscillator's own jitter are not simulated together",
            hint="Leave one of the two out.",
        )
    return Wave(
        depth_rel=ripple.depth_rel,
        omega_per_s=2 * math.pi * ripple.frequency_hz,
        phase_rad=float(rng.uniform(0, 2 * math.pi)),
    )


def _powered_s(circuit: Circuit, acquisition: Acquisition, span_s: float) -> float:
    if not acquisition.start_up and find_topology(circuit.topology).run != "delay":
        return -math.inf
    return span_s / 20 if acquisition.power_up_s is None else acquisition.power_up_s


def _course(circuit: Circuit, legs: list[Leg], powered_s: float, wave: Wave) -> Course:
    changes = [leg for before, leg in pairwise(legs) if before.output_high != leg.output_high]
    return Course(
        circuit=circuit,
        legs=stack_legs(legs),
        edges_s=np.array([leg.start_s for leg in changes], dtype=np.float64),
        edge_high=np.array([leg.output_high for leg in changes], dtype=bool),
        starts_high=legs[0].output_high,
        powered_s=powered_s,
        triggers_s=np.array([], dtype=np.float64),
        trigger_width_s=0.0,
        wave=wave,
    )
