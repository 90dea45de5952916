from __future__ import annotations

import math

import numpy as np
from timing_waves import as_waveform, trapezoid

from benchtool.model.capture import Capture, LogicTrace, Origin, TimeSpan, Trace
from benchtool.timing import Shape, find_roles, find_shapes

TIMES = np.arange(0, 12e-3, 1e-6) + 0.7e-3
WIDTH_S, WAIT_S = 1e-3 * math.log(3), 0.4e-3
PHASE = TIMES % (WIDTH_S + WAIT_S)


def shapes(*traces: Trace) -> tuple[Shape, ...]:
    origin = Origin(source="x.csv", format="text", sha256="")
    return find_shapes(Capture(origin=origin, traces=traces))


def volts(values: np.ndarray, noise_v: float = 0.01) -> Trace:
    rng = np.random.default_rng(1)
    return as_waveform(values + rng.normal(0, noise_v, values.size), 1e-6)


OUTPUT = 5.0 * (PHASE < WIDTH_S)
TRIGGER = 5.0 * (PHASE > 2e-5)
SUPPLY = np.full(TIMES.size, 5.0)
NODE = np.where(PHASE < WIDTH_S, 5 - 5 * np.exp(-PHASE / 1e-3), 0.0)


def test_a_one_shot_with_all_its_traces() -> None:
    traces = [volts(x) for x in (NODE, TRIGGER, SUPPLY, OUTPUT)]
    assert find_roles(shapes(*traces)) == ("capacitor", "trigger", "supply", "output")


def test_an_astable_with_a_rippling_supply() -> None:
    phase = TIMES % 527e-6
    node = np.where(
        phase < 298e-6, 12 - 8 * np.exp(-phase / 430e-6), 8 * np.exp(-(phase - 298e-6) / 330e-6)
    )
    supply = 12 + 0.8 * np.sin(2 * np.pi * 400 * TIMES)
    traces = [volts(supply), volts(12.0 * (phase < 298e-6)), volts(node)]
    assert find_roles(shapes(*traces)) == ("supply", "output", "capacitor")


def test_two_stages_are_two_outputs() -> None:
    other = 5 * trapezoid(TIMES, np.arange(0.2, 50) * 4.4e-4, 1e-6)
    assert find_roles(shapes(volts(OUTPUT), volts(other))) == ("output", "output")


def test_a_lone_flat_trace_is_a_dead_output() -> None:
    assert find_roles(shapes(volts(SUPPLY))) == ("output",)


def test_of_two_flat_traces_the_higher_is_the_supply() -> None:
    assert find_roles(shapes(volts(SUPPLY), volts(0 * SUPPLY))) == ("supply", "output")


def test_noise_beside_an_output_is_something_else() -> None:
    assert find_roles(shapes(volts(OUTPUT), volts(0 * SUPPLY, 1.0))) == ("output", "other")


def test_a_logic_line_that_never_changes_is_something_else() -> None:
    moving = LogicTrace(
        times_s=np.array([1.0, 2.0, 3.0]),
        states=np.array([True, False, True]),
        spans=(TimeSpan(start_s=0, end_s=4, starts_high=False),),
        tick_s=0.1,
        channel="D0",
    )
    still = LogicTrace(
        times_s=np.empty(0),
        states=np.empty(0, np.bool_),
        spans=moving.spans,
        tick_s=0.1,
        channel="D1",
    )
    assert find_roles(shapes(moving, still)) == ("output", "other")


def test_a_trace_that_rises_once_and_first_is_the_supply_coming_up() -> None:
    up = 12.0 * (TIMES > 1.5e-3)
    late = 12.0 * (TIMES > 6e-3)
    assert find_roles(shapes(volts(late), volts(up))) == ("output", "supply")
    assert find_roles(shapes(volts(up * (PHASE < WIDTH_S)), volts(up)))[1] == "supply"


def test_a_trace_that_rises_last_is_no_supply() -> None:
    late = 12.0 * (TIMES > 9e-3)
    assert find_roles(shapes(volts(OUTPUT), volts(late))) == ("output", "output")
