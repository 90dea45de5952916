"""From a circuit and an acquisition to a capture and its truth."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from benchtool.circuits import (
    Circuit,
    Prediction,
    apply_fault,
    circuit_at,
    find_fault,
    find_topology,
    predict,
    products,
    size_range,
)
from benchtool.errors import UsageError
from benchtool.frozen import frozen_record
from benchtool.model.capture import Capture, Origin
from benchtool.model.design import Design, Stage
from benchtool.simulation.acquisition import Acquisition
from benchtool.simulation.course import Course, run_course
from benchtool.simulation.oscillation import mean_intervals, seconds
from benchtool.simulation.pulls import build_network
from benchtool.simulation.recording import count_samples, record_trace
from benchtool.simulation.single_run import trigger_times
from benchtool.simulation.truth import Truth, number_or_none

_RIPPLED_CYCLES = 64


@frozen_record
class Injected:
    """A fault put into a simulated board.

    Attributes:
        name: Name of the fault.
        size: Its size in the fault's own unit; None for the middle of its usual range.
    """

    name: str = "healthy"
    size: float | None = None


HEALTHY = Injected()


def simulate(
    circuit: Circuit, acquisition: Acquisition, rng: np.random.Generator
) -> tuple[Capture, Truth]:
    """Return a synthetic capture and what it holds in truth.

    The output swings between its levels without load; only the timing node feels its loads.

    Args:
        circuit: The circuit, all floats.
        acquisition: How it is recorded.
        rng: Random generator; all that is random comes from it.

    Returns:
        The capture, with one trace for each recorded role, and the truth.

    Raises:
        UsageError: If the acquisition asks for what cannot be simulated.
    """
    prediction = predict(replace(circuit, divide=1))
    duration_s = _duration_s(circuit, prediction, acquisition)
    n_samples = count_samples(acquisition, duration_s)
    span_s = n_samples / acquisition.rate_hz / (1 + acquisition.timebase_rel)
    course = run_course(circuit, prediction, acquisition, span_s, rng)
    traces = tuple(
        record_trace(role, course, acquisition, n_samples, rng) for role in acquisition.record
    )
    origin = Origin(source="simulated", format="simulated", sha256="")
    truth = _truth(circuit, prediction, acquisition, course, span_s)
    return Capture(origin=origin, traces=traces), truth


def simulate_stage(
    stage: Stage,
    design: Design,
    acquisition: Acquisition,
    *,
    fault: Injected = HEALTHY,
    seed: int = 0,
) -> tuple[Capture, Truth]:
    """Return a synthetic capture of one stage of a board, with a named fault.

    Args:
        stage: A stage of ``design``.
        design: Gives supply, temperature and probe.
        acquisition: How it is recorded.
        fault: The fault to put in.
        seed: Seed of the random generator.

    Raises:
        UsageError: If the fault is unknown here, or the acquisition cannot be simulated.
    """
    healthy = circuit_at(stage, design)
    size = _settled_size(fault, healthy)
    circuit = apply_fault(fault.name, healthy, size)
    capture, truth = simulate(circuit, acquisition, np.random.default_rng(seed))
    return capture, truth.labelled(fault=fault.name, fault_size=size, seed=seed)


def _settled_size(fault: Injected, circuit: Circuit) -> float | None:
    """Return the size as given, else the geometric middle of the usual range on this board."""
    entry = find_fault(fault.name)
    if fault.size is not None or not entry.unit:
        return fault.size
    low, high = size_range(entry, circuit)
    return high if low < 0 < high else math.copysign(math.sqrt(low * high), high)


def _duration_s(circuit: Circuit, prediction: Prediction, acquisition: Acquisition) -> float:
    """Return the length of the record in indicated seconds."""
    if acquisition.duration_s is not None:
        return acquisition.duration_s
    run = find_topology(circuit.topology).run
    if run == "t_high":
        unit_s, _ = trigger_times(prediction, acquisition)
    else:
        unit_s = seconds(prediction.delay if run == "delay" else prediction.period)
    if not math.isfinite(unit_s):
        raise UsageError(
            "this circuit stands still, so a number of periods gives no duration",
            hint="Give the duration in seconds.",
        )
    return (acquisition.periods or 0.0) * unit_s * circuit.divide * (1 + acquisition.timebase_rel)


def _truth(
    circuit: Circuit,
    prediction: Prediction,
    acquisition: Acquisition,
    course: Course,
    span_s: float,
) -> Truth:
    t_high, t_low = _long_run(circuit, prediction, acquisition, course)
    period = t_high + t_low
    inside = (course.edges_s > 0) & (course.edges_s < span_s)
    tau = products(circuit)
    refs = find_topology(circuit.topology).parts
    stuck, rippled = prediction.stuck, course.wave.depth_rel > 0
    return Truth(
        topology=circuit.topology,
        t_high=number_or_none(t_high),
        t_low=number_or_none(t_low),
        period=number_or_none(period),
        frequency=number_or_none(1 / period),
        duty=number_or_none(t_high / period),
        first_high=None if rippled else number_or_none(seconds(prediction.first_high)),
        delay=number_or_none(seconds(prediction.delay)),
        stuck=f"{stuck.state}: {stuck.reason}" if stuck else None,
        tau_charge=float(tau.tau_charge),
        tau_discharge=float(tau.tau_discharge),
        tau_RA=None if tau.tau_RA is None else float(tau.tau_RA),
        parts={ref: float(getattr(circuit, ref)) for ref in refs},
        supply_v=float(circuit.supply),
        powered_s=number_or_none(course.powered_s),
        edges_s=course.edges_s[inside],
        edge_rising=tuple(bool(state) for state in course.edge_high[inside]),
        timebase_rel=acquisition.timebase_rel,
        jitter_rel=acquisition.jitter_rel,
    )


def _long_run(
    circuit: Circuit, prediction: Prediction, acquisition: Acquisition, course: Course
) -> tuple[float, float]:
    """Return long-run mean high and low time of the output, seconds; NaN where there is none."""
    run = find_topology(circuit.topology).run
    t_high, t_low = seconds(prediction.t_high), seconds(prediction.t_low)
    if run == "t_high" and math.isfinite(t_high):
        every_s, _ = trigger_times(prediction, acquisition)
        return t_high, math.ceil(t_high / every_s) * every_s - t_high
    if run is not None or prediction.stuck is not None:
        return math.nan, math.nan
    if course.wave.depth_rel:
        network = build_network(circuit, course.wave.depth_rel)
        t_high, t_low = mean_intervals(network, course.wave, _RIPPLED_CYCLES)
    if circuit.divide == 1:
        return t_high, t_low
    n_high = (circuit.divide + 1) // 2
    return n_high * (t_high + t_low), (circuit.divide - n_high) * (t_high + t_low)
