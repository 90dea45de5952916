"""A simulated board seen through a counter."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from counted_boards import FUNCTIONS, opened

from benchtool.circuits import circuit_at, predict
from benchtool.designs import load_design
from benchtool.instruments import Order
from benchtool.simulation import Acquisition, Injected
from benchtool_drivers.loopback.board import SimulatedBoard
from benchtool_drivers.loopback.families.counters import COUNTERS, Beat

DESIGN = Path(__file__).parents[2] / "sample_captures" / "mist_valve.toml"


def simulated(fault: str = "healthy", *, jitter_rel: float = 0.0) -> SimulatedBoard:
    design = load_design(DESIGN)
    acquisition = Acquisition(rate_hz=1e6, periods=4, timebase_rel=1e-3, jitter_rel=jitter_rel)
    return SimulatedBoard(design.stages[0], design, acquisition, fault=Injected(name=fault))


def test_a_board_beats_as_its_circuit_does_by_the_instruments_clock() -> None:
    design = load_design(DESIGN)
    times = predict(circuit_at(design.stages[0], design))
    beat = simulated().beat(0.0)
    assert beat is not None
    assert beat.t_high == pytest.approx(float(times.t_high or 0) * 1.001, rel=1e-12)
    assert beat.t_low == pytest.approx(float(times.t_low or 0) * 1.001, rel=1e-12)


def test_edges_for_ever_are_those_of_the_beat() -> None:
    board = simulated()
    beat, edges = board.beat(0.0), board.edges()
    assert beat is not None
    times_s = [next(edges)[0] for _ in range(7)]
    due_s = [beat.t_high, beat.t_low] * 3
    np.testing.assert_allclose(np.diff(times_s), due_s, rtol=1e-9)  # sums of six floats


def test_a_counter_reads_the_board() -> None:
    board = simulated(jitter_rel=1e-4)
    found = board.beat(0.0)
    assert found is not None
    beat: Beat = found
    with opened(COUNTERS["functions"](lambda: beat), FUNCTIONS) as counter:
        values = counter.count(Order(readings=30, functions=("t_high",))).readings["t_high"].values
    # the mean of 30 is within five of its standard deviations
    assert values.mean() == pytest.approx(beat.t_high, rel=5e-4 / 30**0.5)
