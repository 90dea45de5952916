"""The truth of a capture: what it holds, and that it survives a file."""

from __future__ import annotations

import json

import numpy as np
import pytest

from benchtool.circuits import Circuit, apply_fault
from benchtool.errors import InputError, UsageError
from benchtool.model.design import Band, Design, Part, Stage
from benchtool.simulation import Acquisition, Injected, read_truth, simulate, simulate_stage

PARTS = {
    "RA": Part(ref="RA", value=100e3),
    "RB": Part(ref="RB", value=330e3),
    "C": Part(ref="C", value=47e-6),
}
STAGE = Stage(name="spacing", topology="astable", parts=PARTS)
DESIGN = Design(
    name="Mist valve timer", supply=Band(nominal=12.0, lower=11.4, upper=12.6), stages=(STAGE,)
)
ACQUISITION = Acquisition(rate_hz=20.0, periods=3, jitter_rel=1e-3, timebase_rel=20e-6)


def test_a_truth_comes_back_from_its_file_as_it_was() -> None:
    _, truth = simulate_stage(
        STAGE, DESIGN, ACQUISITION, fault=Injected(name="C-low", size=-0.2), seed=11
    )
    again = read_truth(truth.to_json())
    assert again.to_json() == truth.to_json()
    np.testing.assert_array_equal(again.edges_s, truth.edges_s)
    assert (again.fault, again.fault_size, again.seed) == ("C-low", -0.2, 11)


def test_a_truth_names_products_parts_and_errors() -> None:
    _, truth = simulate_stage(STAGE, DESIGN, ACQUISITION)
    assert truth.tau_charge == pytest.approx(430e3 * 47e-6)
    assert truth.tau_discharge == pytest.approx(330e3 * 47e-6)
    assert truth.tau_RA == pytest.approx(100e3 * 47e-6)
    assert truth.parts == {"RA": 100e3, "RB": 330e3, "C": 47e-6}
    assert (truth.timebase_rel, truth.jitter_rel, truth.supply_v) == (20e-6, 1e-3, 12.0)
    assert truth.fault == "healthy"


def test_the_parts_in_the_truth_are_those_of_the_faulty_board() -> None:
    _, truth = simulate_stage(STAGE, DESIGN, ACQUISITION, fault=Injected(name="C-low", size=-0.2))
    assert truth.parts["C"] == pytest.approx(0.8 * 47e-6)
    assert truth.tau_discharge == pytest.approx(0.8 * 330e3 * 47e-6)


def test_a_fault_of_no_stated_size_gets_a_usual_one_and_says_which() -> None:
    _, truth = simulate_stage(STAGE, DESIGN, ACQUISITION, fault=Injected(name="C-low"))
    assert truth.fault_size is not None
    assert truth.parts["C"] == pytest.approx((1 + truth.fault_size) * 47e-6)


def test_figures_that_a_board_lacks_are_null_and_never_nan(spacing: Circuit) -> None:
    stuck = apply_fault("C-leaky", spacing, 500e3)
    acquisition = Acquisition(rate_hz=20.0, duration_s=10.0)
    _, truth = simulate(stuck, acquisition, np.random.default_rng(0))
    document = json.loads(truth.to_json())
    assert document["t_high"] is None
    assert document["delay"] is None
    assert "NaN" not in truth.to_json()


def test_an_unknown_fault_is_refused() -> None:
    with pytest.raises(UsageError, match="no fault"):
        simulate_stage(STAGE, DESIGN, ACQUISITION, fault=Injected(name="moth"))


def test_a_standing_board_needs_a_duration() -> None:
    with pytest.raises(UsageError, match="stands still"):
        simulate_stage(STAGE, DESIGN, ACQUISITION, fault=Injected(name="C-leaky", size=500e3))


@pytest.mark.parametrize("text", ["", "[]", "{}", '{"schema": "benchtool-truth/1"}', "\x00"])
def test_what_is_no_truth_is_refused(text: str) -> None:
    with pytest.raises(InputError, match="no truth"):
        read_truth(text)
