"""Further readings and captures, each where it belongs in the model."""

from __future__ import annotations

from dataclasses import replace

import pytest
from diagnose_misting import (
    BOARD,
    DESIGN,
    STAGE,
    all_sum,
    answer,
    capture,
    chance,
    control_pin,
    evidence_of,
    faulty,
    part,
    weigh,
    with_shunt,
)

from benchtool.circuits import circuit_at
from benchtool.circuits.circuit import with_fields
from benchtool.model.diagnosis import Reading


def test_the_control_pin_settles_what_it_can():
    board = faulty(("control-low", -0.1))
    found = answer(evidence_of(board, control_pin(7.2)))
    assert found.best.fault == "control-low"
    assert found.best.probability > 0.95
    assert found.is_certain
    assert found.next == ()
    assert found.stop
    spared = answer(evidence_of(faulty(("RA-low", -0.5)), control_pin(8.0)))
    assert chance(spared, "control-low") < 0.01


def test_a_comparators_own_shift_does_not_show_at_the_control_pin():
    board = faulty(("upper-threshold", -0.1))
    assert weigh(evidence_of(board, control_pin(8.0))).best.fault == "upper-threshold"


def test_an_isolated_ohmmeter_reading_frees_or_blames_its_part():
    board = faulty(("RB-high", 0.2))
    assert weigh(evidence_of(board, part("RB", 396e3))).best.fault == "RB-high"
    freed = weigh(evidence_of(faulty(("C-high", 0.25)), part("RB", 330e3)))
    assert chance(freed, "RB-high") < 0.01


def test_a_bound_from_an_ohmmeter_in_the_circuit_counts():
    board = faulty(("RB-high", 0.2))
    without = weigh(evidence_of(board))
    upper = weigh(evidence_of(board, part("RB", 340e3, way="at-most")))
    lower = weigh(evidence_of(board, part("RB", 380e3, way="at-least")))
    assert chance(upper, "RB-high") < 0.2 * chance(without, "RB-high")
    assert chance(lower, "RB-high") > chance(without, "RB-high")
    assert all_sum(upper) == pytest.approx(1.0, abs=1e-9)


def test_a_shunt_tells_a_low_capacitor_from_low_resistors():
    board = faulty(("R-all-low", -0.3))
    second = capture(with_shunt(board, 2.2e6), "shunt", value=2.2e6, u=22e3)
    assert weigh(evidence_of(board, captures=(second,))).best.fault == "R-all-low"


def test_an_added_capacitor_tells_the_same():
    board = faulty(("R-all-low", -0.3))
    more = with_fields(board, {"C": board.C + 47e-6})
    second = capture(more, "added-capacitor", value=47e-6, u=0.47e-6)
    assert weigh(evidence_of(board, captures=(second,))).best.fault == "R-all-low"


def test_a_power_up_record_tells_a_lower_threshold_from_the_upper():
    board = faulty(("lower-threshold", 0.1))
    first = capture(board, "power-up", "first_high")
    found = weigh(evidence_of(board, captures=(first,)))
    assert found.best.fault == "lower-threshold"
    assert "the first high after power-up" in found.used


def test_a_lifted_probe_tells_a_probe_from_a_leak():
    board = faulty(("probe-load", 1e6))
    asked = answer(evidence_of(board))
    assert "probe-lifted" in [item.reading for item in asked.next]
    lifted = answer(evidence_of(board, captures=(capture(BOARD, "probe-lifted"),)))
    assert lifted.best.fault == "probe-load"
    still = answer(
        evidence_of(
            faulty(("C-leaky", 2e6)), captures=(capture(faulty(("C-leaky", 2e6)), "probe-lifted"),)
        )
    )
    assert still.best.fault == "C-leaky"


def test_a_second_supply_tells_a_leaking_switch_from_ra():
    board = faulty(("discharge-leak", 2e-5))
    at_8_v = replace(DESIGN, supply=replace(DESIGN.supply, nominal=8.0, lower=8.0, upper=8.0))
    slower = faulty(("discharge-leak", 2e-5), board=circuit_at(STAGE, at_8_v))
    second = capture(slower, "supply", value=8.0, u=0.01)
    found = weigh(evidence_of(board, captures=(second,)))
    assert chance(found, "discharge-leak") > 20 * chance(found, "RA-high")


def test_heat_tells_a_leak_from_a_probe():
    """20 K make a leak four times as large, and leave a probe as it is."""
    board = faulty(("C-leaky", 6e6))
    warm = with_fields(board, {"shunt_ohm": board.shunt_ohm / 4})
    second = capture(warm, "heated", value=45.0, part="C")
    cold, found = weigh(evidence_of(board)), weigh(evidence_of(board, captures=(second,)))
    assert found.best.fault == "C-leaky"
    assert found.single.passes
    assert chance(found, "probe-load") < 0.1 * chance(cold, "probe-load")


def test_against_a_baseline_a_small_change_counts():
    """1.5 % of C is inside its tolerance of 5 %, and thirty times u against the same board."""
    aged = faulty(("C-low", -0.015))
    alone = weigh(evidence_of(aged))
    assert alone.best.fault == "healthy"
    changed = weigh(evidence_of(aged, captures=(capture(BOARD, "baseline"),)))
    assert changed.best.fault == "C-low"
    assert changed.best.estimate.value < 47e-6 * 1.06
    another = weigh(evidence_of(aged, captures=(capture(BOARD, "baseline", same_board=False),)))
    assert another.best.fault == "healthy"


def test_readings_of_the_node_settle_almost_everything():
    board = faulty(("node-leak-to-supply", 4e6))
    from benchtool.circuits import settle_states

    states = settle_states(board)
    figures = {
        "node-upper": (board.v_upper, "V"),
        "node-lower": (board.v_lower, "V"),
        "node-charge-end": (states.charge[-1].v, "V"),
        "node-discharge-end": (states.discharge.v, "V"),
        "node-tau-charge": (states.charge[-1].tau, "s"),
        "node-tau-discharge": (states.discharge.tau, "s"),
    }
    readings = tuple(
        Reading(kind=kind, value=float(value), u=max(0.005 * abs(float(value)), 0.01), unit=unit)
        for kind, (value, unit) in figures.items()
    )
    found = weigh(evidence_of(board, *readings))
    assert found.best.fault == "node-leak-to-supply"
    assert found.best.probability > 0.95
