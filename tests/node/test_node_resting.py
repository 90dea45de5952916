from __future__ import annotations

from itertools import product

import pytest
from node_boards import RA, RB, SUPPLY, board, volts

from benchtool.circuits import FAULTS, apply_fault, predict, settle_states
from benchtool.circuits.circuit import with_fields
from benchtool.node import read_resting_node

THRESHOLDS = (8.0, 4.0)

STUCK = [
    ("C-short", 1.0),
    ("RA-open", 1e12),
    ("RB-open", 1e12),
    ("C-leaky", 300e3),
    ("discharge-leak", 60e-6),
    ("probe-load", 500e3),
    ("node-leak-to-supply", 200e3),
]


@pytest.mark.parametrize(("fault", "size"), STUCK)
def test_a_simulated_fault_is_among_those_its_node_allows(fault: str, size: float) -> None:
    """The circuit model says where the node rests; the table must name what was put in."""
    moved = apply_fault(fault, board(i_leak=1e-9, i_discharge_leak=1e-10), size)
    stuck = predict(moved).stuck
    assert stuck
    states = settle_states(moved)
    assert states.discharge
    node_v = float(states.charge[-1].v if stuck.state == "high" else states.discharge.v)
    found = read_resting_node(
        stuck.state, volts(max(0.0, node_v), 0.02), SUPPLY, THRESHOLDS, topology="astable"
    )
    assert fault in found.faults


def test_the_level_tells_a_short_from_a_leak() -> None:
    short = read_resting_node("high", volts(0.0, 0.01), SUPPLY, THRESHOLDS, topology="astable")
    leak = read_resting_node("high", volts(5.0, 0.01), SUPPLY, THRESHOLDS, topology="astable")
    deaf = read_resting_node("high", volts(12.0, 0.01), SUPPLY, THRESHOLDS, topology="astable")
    assert (short.zone, leak.zone, deaf.zone) == ("zero", "between", "rail")
    assert "C-leaky" not in short.faults
    assert "C-short" not in leak.faults
    assert set(deaf.faults) == {"upper-threshold", "control-high"}


def test_the_resistance_that_holds_the_node_is_a_divider() -> None:
    leaky = with_fields(board(), {"shunt_ohm": 300e3})
    node_v = float(settle_states(leaky).charge[0].v)
    found = read_resting_node(
        "high", volts(node_v, 0.01), SUPPLY, THRESHOLDS, charge_ohm=RA + RB, discharge_ohm=RB
    )
    assert found.holding_ohm == pytest.approx(300e3, rel=1e-9)
    up = with_fields(board(r_on=0.0), {"leak_ohm": 200e3, "leak_to_v": SUPPLY})
    discharge = settle_states(up).discharge
    assert discharge
    found = read_resting_node(
        "low", volts(float(discharge.v), 0.01), SUPPLY, THRESHOLDS, discharge_ohm=RB
    )
    assert found.holding_ohm == pytest.approx(200e3, rel=1e-9)


def test_near_a_border_both_sides_count() -> None:
    sharp = read_resting_node("high", volts(4.1, 0.01), SUPPLY, THRESHOLDS)
    blurred = read_resting_node("high", volts(4.1, 0.1), SUPPLY, THRESHOLDS)
    assert sharp.zones == ("between",)
    assert set(blurred.zones) == {"between", "low"}
    assert set(sharp.faults) < set(blurred.faults)


@pytest.mark.parametrize("topology", ["astable", "schmitt", "output-fed", "astable-diode"])
def test_every_fault_that_is_named_exists_and_fits_the_topology(topology: str) -> None:
    for state, level in product(("high", "low"), (0.0, 2.0, 6.0, 9.0, 12.0)):
        found = read_resting_node(state, volts(level, 0.01), SUPPLY, THRESHOLDS, topology=topology)
        assert found.faults
        assert all(topology in FAULTS[name].topologies for name in found.faults)
