"""From evidence to the answer: boards with known faults, and what is proposed next."""

from __future__ import annotations

import subprocess
import sys
from dataclasses import replace

import pytest
from diagnose_misting import (
    BOARD,
    STAGE,
    all_sum,
    answer,
    capture,
    chance,
    control_pin,
    evidence_of,
    faulty,
    make_design,
    make_stage,
    weigh,
    with_shunt,
)

from benchtool.circuits import circuit_at, predict
from benchtool.diagnose.costs import COSTS
from benchtool.diagnose.priors import DEFAULT_PRIORS, Prior
from benchtool.errors import SolveError
from benchtool.model.design import Part
from benchtool.model.diagnosis import Evidence, Observation, Reading
from benchtool.model.timing import Timing


@pytest.fixture(scope="module")
def c_low():
    return answer(evidence_of(faulty(("C-low", -0.3))))


def test_a_dried_out_capacitor_is_named_with_its_value(c_low):
    best = c_low.best
    assert best.fault == "C-low"
    assert best.estimate.unit == "F"
    assert best.lower < 0.7 * 47e-6 < best.upper
    assert best.nominal == 47e-6
    assert "capacitor C" in c_low.sentence


def test_probabilities_sum_to_one_with_healthy_and_unexplained_among_them(c_low):
    assert all_sum(c_low) == pytest.approx(1.0, abs=1e-9)
    assert {"healthy", "unexplained"} <= {item.fault for item in c_low.suspects}


def test_what_the_data_cannot_separate_comes_as_one_group(c_low):
    group = c_low.groups[0]
    assert {"C-low", "R-all-low"} <= set(group.members)
    assert "same proportion" in group.why
    assert all(item.group == 1 for item in c_low.suspects if item.fault in group.members)


def test_a_healthy_board_is_healthy():
    found = weigh(evidence_of(BOARD))
    assert found.best.fault == "healthy"
    assert found.best.probability > 0.7
    assert found.single.passes
    assert "Nothing points to a fault" in found.sentence


def test_the_control_pin_comes_first_where_it_and_ra_are_the_suspects():
    found = answer(evidence_of(faulty(("control-low", -0.1))))
    assert found.next[0].reading == "control-pin"
    shown = {item.fault: item.value for item in found.next[0].shows}
    assert shown["control-low"] == pytest.approx(7.2, rel=0.02)
    assert shown["RA-low"] == pytest.approx(8.0, rel=0.01)
    rates = [item.bits_per_minute for item in found.next]
    assert rates == sorted(rates, reverse=True)
    assert all(item.caution for item in found.next)


def test_the_shunt_comes_before_the_pin_where_c_and_rb_are_the_suspects():
    stage = make_stage(4.7e3, 470e3, 10e-9)
    design = make_design(stage, 9.0)
    board = circuit_at(stage, design)
    found = answer(evidence_of(faulty(("RB-low", -0.2), board=board)), stage, design)
    assert {"C-low", "RB-low"} <= set(found.groups[0].members)
    order = [item.reading for item in found.next]
    assert "shunt" in order
    assert "control-pin" not in order or order.index("shunt") < order.index("control-pin")


def test_two_faults_are_not_called_a_single_one():
    board = faulty(("control-low", -0.15), ("C-low", -0.3))
    second = capture(with_shunt(board, 2.2e6), "shunt", value=2.2e6, u=22e3)
    found = weigh(evidence_of(board, control_pin(6.8), captures=(second,)))
    assert not found.single.passes
    assert not found.is_certain
    pairs = [set(item.faults) for item in found.suspects if item.fault == "two-faults"]
    assert {"control-low", "C-low"} in pairs
    assert "No single fault" in found.sentence
    assert all_sum(found) == pytest.approx(1.0, abs=1e-9)


def test_a_shunt_that_would_stop_the_board_is_never_proposed():
    """Whatever is proposed leaves the true board running; next to stopping, nothing is."""
    for leak_ohm in (1.2e6, 2e6, 4e6):
        board = faulty(("C-leaky", leak_ohm))
        found = answer(evidence_of(board))
        for item in found.next:
            if item.reading == "shunt":
                assert item.value >= 3 * 430e3
                assert predict(with_shunt(board, item.value)).stuck is None
    almost = answer(evidence_of(faulty(("C-leaky", 0.9e6))))
    assert "shunt" not in [item.reading for item in almost.next]


def test_costs_and_priors_can_be_replaced():
    evidence = evidence_of(faulty(("control-low", -0.1)))
    fewer = {name: cost for name, cost in COSTS.items() if name != "control-pin"}
    assert "control-pin" not in [item.reading for item in answer(evidence, costs=fewer).next]
    table = {**DEFAULT_PRIORS.table, "control-low": Prior(weight=0.0)}
    without = answer(evidence, priors=replace(DEFAULT_PRIORS, table=table))
    assert "control-low" not in {item.fault for item in without.suspects}


def test_an_electrolytic_is_suspected_before_a_film_capacitor():
    evidence = evidence_of(faulty(("C-low", -0.25)))
    film = {**STAGE.parts, "C": replace(STAGE.parts["C"], kind="film")}
    other = weigh(evidence, replace(STAGE, parts=film))
    assert chance(weigh(evidence), "R-all-low") < chance(other, "R-all-low")


def test_a_part_without_a_tolerance_is_given_one_and_it_is_said():
    bare = {**STAGE.parts, "C": Part(ref="C", value=47e-6)}
    found = weigh(evidence_of(BOARD), replace(STAGE, parts=bare))
    assert "assumed-tolerance" in [item.code for item in found.warnings]


def test_a_reading_that_means_nothing_here_is_left_out_and_it_is_said():
    level = Reading(kind="node-level", value=3.0, u=0.1, unit="V")
    found = weigh(evidence_of(BOARD, level))
    assert "reading-left-out" in [item.code for item in found.warnings]


def test_without_a_time_or_a_reading_there_is_nothing_to_diagnose():
    with pytest.raises(SolveError):
        weigh(Evidence(observations=(Observation(timing=Timing()),)))


def test_no_statistics_library_is_loaded():
    code = "import sys; from benchtool.diagnose import diagnose; assert 'scipy' not in sys.modules"
    subprocess.run([sys.executable, "-c", code], check=True)
