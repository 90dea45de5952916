"""Every fault moves what it says it moves, and does to the times what a person would see."""

from __future__ import annotations

import math
from dataclasses import fields, replace

import pytest
from circuit_boards import make_design, make_stage

from benchtool.circuits import (
    FAULTS,
    TOPOLOGIES,
    Circuit,
    apply_fault,
    circuit_at,
    faults_of,
    find_fault,
    predict,
    size_range,
)
from benchtool.errors import UsageError

NAMES = [
    "healthy",
    "C-low",
    "C-high",
    "C-leaky",
    "C-esr",
    "C-open",
    "C-short",
    "RA-low",
    "RA-high",
    "RA-open",
    "RB-low",
    "RB-high",
    "RB-open",
    "R-low",
    "R-high",
    "R-open",
    "R-all-low",
    "R-all-high",
    "discharge-leak",
    "discharge-weak",
    "control-low",
    "control-high",
    "control-bypass-missing",
    "upper-threshold",
    "lower-threshold",
    "node-leak-to-supply",
    "slow-ic",
    "probe-load",
    "wrong-ic-family",
    "output-high-drop",
    "output-low-rise",
    "diode-open",
    "diode-short",
]
VALUES = {"astable": {"RA": 100e3, "RB": 330e3, "C": 47e-6}}
STANDS_STILL = {"C-short", "RA-open", "RB-open", "R-open"}


def board(topology: str) -> Circuit:
    refs = TOPOLOGIES[topology].parts
    values = VALUES.get(topology) or {ref: 47e-6 if ref == "C" else 100e3 for ref in refs}
    stage = make_stage(topology, values)
    return circuit_at(stage, make_design(stage))


CASES = [(fault.name, topology) for fault in FAULTS.values() for topology in fault.topologies]


def test_the_list_of_faults_is_the_agreed_one():
    assert sorted(FAULTS) == sorted(NAMES)


@pytest.mark.parametrize(("name", "topology"), CASES)
def test_a_fault_moves_its_fields_and_no_others(name, topology):
    healthy = board(topology)
    faulty = apply_fault(name, healthy)
    moved = {
        item.name
        for item in fields(Circuit)
        if repr(getattr(healthy, item.name)) != repr(getattr(faulty, item.name))
    }
    assert moved <= set(find_fault(name).move.fields)
    assert bool(moved) == (name != "healthy")


@pytest.mark.parametrize(("name", "topology"), CASES)
def test_a_fault_of_usual_size_runs_unless_it_stops_the_circuit(name, topology):
    """An open part without a leak beside it is not stuck but slower than anyone waits."""
    before, after = (predict(c) for c in (board(topology), apply_fault(name, board(topology))))
    shown = "delay" if topology == "power-on" else "t_high"
    longest = max(getattr(after, key) or 0 for key in ("t_high", "t_low", "delay"))
    stands = after.stuck is not None or longest > 1e4 * getattr(before, shown)
    assert stands == (name in STANDS_STILL)


@pytest.mark.parametrize(("name", "topology"), CASES)
def test_the_usual_sizes_are_in_order_and_in_the_faults_unit(name, topology):
    fault, circuit = find_fault(name), board(topology)
    low, high = size_range(fault, circuit)
    assert low <= high
    assert fault.seen.endswith(".")
    assert fault.unit in ("1", "ohm", "F", "A", "V", "s", "")
    assert (low == high == 0) == (fault.unit == "")


def changes(name: str, size: float | None = None, topology: str = "astable") -> tuple[float, float]:
    """Relative changes of high and low time."""
    healthy = board(topology)
    before, after = predict(healthy), predict(apply_fault(name, healthy, size))
    return after.t_high / before.t_high - 1, after.t_low / before.t_low - 1


def test_directions_in_the_plane_of_high_and_low_time():
    """Angles of the design notes: C 45, RB 52.5, RA and control 0, leak about -30, switch 90."""

    def angle(name: str, size: float) -> float:
        high, low = changes(name, size)
        return math.degrees(math.atan2(low, high))

    assert angle("C-high", 0.01) == pytest.approx(45, abs=0.1)
    assert angle("RB-high", 0.01) == pytest.approx(math.degrees(math.atan2(43, 33)), abs=0.2)
    assert angle("RA-high", 0.01) == pytest.approx(0, abs=0.1)
    assert angle("control-high", 0.01) == pytest.approx(0, abs=0.1)
    assert angle("discharge-leak", 1e-6) == pytest.approx(0, abs=0.1)
    assert angle("C-leaky", 100e6) == pytest.approx(-33, abs=2)
    assert angle("discharge-weak", 1e3) == pytest.approx(90, abs=0.1)


def test_output_faults_move_one_time_each():
    high, low = changes("output-high-drop", 0.5, "output-fed")
    assert high > 0.03
    assert abs(low) < 1e-6  # the overshoot of the delay alone
    high, low = changes("output-low-rise", 0.5, "output-fed")
    assert low > 0.03
    assert abs(high) < 1e-6


def test_an_open_diode_leaves_a_plain_astable():
    healthy = board("astable-diode")
    plain = replace(healthy, topology="astable")
    faulty = predict(apply_fault("diode-open", healthy))
    assert faulty.t_high == pytest.approx(predict(plain).t_high, rel=1e-12)


def test_a_shorted_diode_takes_rb_out():
    healthy = board("astable-diode")
    faulty = predict(apply_fault("diode-short", healthy, 1.0))
    assert faulty.t_low < 1e-3 * predict(healthy).t_low
    assert faulty.t_high == pytest.approx(100e3 * 47e-6 * math.log(2), rel=1e-3)


def test_leaks_to_different_rails_are_joined():
    circuit = replace(board("astable"), leak_ohm=2e6, leak_to_v=0.0)
    joined = apply_fault("node-leak-to-supply", circuit, 2e6)
    assert joined.leak_ohm == pytest.approx(1e6)
    assert joined.leak_to_v == pytest.approx(6.0)


def test_the_wrong_family_brings_the_other_familys_terms():
    circuit = board("astable")
    swapped = apply_fault("wrong-ic-family", circuit)
    assert swapped.family == "bipolar"
    assert (swapped.v_sat, swapped.r_on) == (0.037, 9.5)
    assert apply_fault("wrong-ic-family", swapped).r_on == pytest.approx(circuit.r_on)
    with pytest.raises(UsageError, match="right one"):
        apply_fault("wrong-ic-family", replace(circuit, family=None))


def test_faults_keep_to_their_topologies():
    assert find_fault("diode-open") not in faults_of("astable")
    assert faults_of("one-shot")[0].name == "healthy"
    with pytest.raises(UsageError, match="cannot happen"):
        apply_fault("RA-low", board("one-shot"))
    with pytest.raises(UsageError, match="no fault called"):
        find_fault("C-wet")
