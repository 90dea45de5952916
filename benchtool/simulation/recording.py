"""What the instrument makes of volts and edges: samples, codes, transitions."""

from __future__ import annotations

import math

import numpy as np

from benchtool.errors import UsageError
from benchtool.model.arrays import BoolArray, FloatArray
from benchtool.model.capture import (
    ArraySamples,
    LogicTrace,
    Role,
    Scale,
    Span,
    TimeSpan,
    Trace,
    UniformTime,
    Waveform,
)
from benchtool.simulation.acquisition import Acquisition
from benchtool.simulation.course import Course
from benchtool.simulation.voltages import role_voltage

MOST_SAMPLES = 200_000_000
"""More samples a trace are refused: they would not fit in memory."""


def count_samples(acquisition: Acquisition, duration_s: float) -> int:
    """Return the number of samples of a record of ``duration_s`` indicated seconds.

    Raises:
        UsageError: If there are fewer than two, or more than ``MOST_SAMPLES``.
    """
    count = duration_s * acquisition.rate_hz
    if not 2 <= count <= MOST_SAMPLES:
        raise UsageError(
            f"{duration_s:.3g} s at {acquisition.rate_hz:.3g} samples a second make "
            f"{count:.3g} samples, and 2 to {MOST_SAMPLES:.0e} can be simulated",
            hint="Change the rate or the duration.",
        )
    return round(count)


def record_trace(
    role: Role,
    course: Course,
    acquisition: Acquisition,
    n_samples: int,
    rng: np.random.Generator,
) -> Trace:
    """Return one trace as the instrument records it.

    Args:
        role: Which trace.
        course: What the board does.
        acquisition: How it is recorded.
        n_samples: Number of samples or ticks.
        rng: Draws the noise.
    """
    if acquisition.kind == "logic":
        return _transitions(role, course, acquisition, n_samples)
    clock = 1 + acquisition.timebase_rel
    times_s = np.arange(n_samples) / (acquisition.rate_hz * clock)
    if acquisition.kind == "sampled-logic":
        states = _states_at(*_changes(role, course), times_s)
        return _waveform(states.astype(np.uint8), acquisition, role, Scale(), unit="1")
    volts = role_voltage(role, course, times_s, acquisition.bandwidth_hz)
    volts = volts + acquisition.offset_v
    if acquisition.noise_v:
        volts = volts + rng.normal(0.0, acquisition.noise_v, n_samples)
    if acquisition.bits is None:
        return _waveform(volts, acquisition, role, Scale())
    codes, scale = quantise(volts, acquisition, float(course.circuit.supply))
    return _waveform(codes, acquisition, role, scale)


def quantise(
    volts: FloatArray, acquisition: Acquisition, supply_v: float
) -> tuple[np.ndarray[tuple[int], np.dtype[np.int32]], Scale]:
    """Return codes, clipped at the converter's range, and their scale.

    Args:
        volts: Samples in volts, shape (n,).
        acquisition: Bits and range of the converter.
        supply_v: Sets the range where the acquisition states none.
    """
    bits = acquisition.bits or 8
    low_v, high_v = acquisition.full_scale_v or (-supply_v / 8, supply_v * 9 / 8)
    step_v = (high_v - low_v) / 2**bits
    middle = 2 ** (bits - 1)
    zero_v = low_v + step_v * middle
    codes = np.clip(np.rint((volts - zero_v) / step_v), -middle, middle - 1).astype(np.int32)
    return codes, Scale(gain=step_v, offset=zero_v, step_v=step_v)


def _waveform(
    samples: np.ndarray[tuple[int], np.dtype[np.generic]],
    acquisition: Acquisition,
    role: Role,
    scale: Scale,
    unit: str = "V",
) -> Waveform:
    return Waveform(
        samples=ArraySamples(samples),
        scale=scale,
        time=UniformTime(dt_s=1 / acquisition.rate_hz),
        spans=(Span(start=0, stop=samples.size, start_s=0.0),),
        channel=acquisition.channel(role),
        unit=unit,
    )


def _changes(role: Role, course: Course) -> tuple[FloatArray, BoolArray, bool]:
    """Return when a trace changes its logic state, the state after each, and before the first."""
    if role == "output":
        return course.edges_s, course.edge_high, course.starts_high
    if role == "trigger":
        begins_s = course.triggers_s
        times_s = np.column_stack((begins_s, begins_s + course.trigger_width_s)).ravel()
        return times_s, np.tile([False, True], begins_s.size), True
    if role == "supply":
        stepped = math.isfinite(course.powered_s)
        times_s = np.array([course.powered_s] if stepped else [], dtype=np.float64)
        return times_s, np.ones(times_s.size, dtype=bool), not stepped
    raise UsageError(
        "a capacitor node has no logic states", hint="Record it as a waveform, or leave it out."
    )


def _states_at(
    changes_s: FloatArray, states: BoolArray, start: bool, times_s: FloatArray
) -> BoolArray:
    index = np.searchsorted(changes_s, times_s, side="right")
    found: BoolArray = np.concatenate(([start], states))[index]
    return found


def _transitions(role: Role, course: Course, acquisition: Acquisition, n_ticks: int) -> LogicTrace:
    """Return the transitions that a clock of ``rate_hz`` sees: at the first tick after each."""
    changes_s, states, start = _changes(role, course)
    clock = 1 + acquisition.timebase_rel
    ticks = np.ceil(changes_s * clock * acquisition.rate_hz)
    starts_high = bool(_states_at(changes_s, states, start, np.zeros(1))[0])
    inside = (ticks > 0) & (ticks < n_ticks)
    ticks, states = ticks[inside], states[inside]
    last = np.append(np.diff(ticks) > 0, True)[: ticks.size]
    ticks, states = ticks[last], states[last]
    changed = np.diff(np.concatenate(([starts_high], states)).astype(np.int8)) != 0
    return LogicTrace(
        times_s=ticks[changed] / acquisition.rate_hz,
        states=states[changed],
        spans=(
            TimeSpan(start_s=0.0, end_s=n_ticks / acquisition.rate_hz, starts_high=starts_high),
        ),
        tick_s=1 / acquisition.rate_hz,
        channel=acquisition.channel(role),
    )
