"""Every topology with the times it has, and boards that stand still."""

from __future__ import annotations

import pytest
from diagnose_misting import (
    all_sum,
    answer,
    at_rest,
    chance,
    faulty,
    make_design,
    weigh,
)

from benchtool.circuits import TOPOLOGIES, circuit_at, predict
from benchtool.model.design import Ic, Part, Stage, Threshold
from benchtool.model.diagnosis import Evidence, Observation, Reading
from benchtool.model.quantity import Measured
from benchtool.model.timing import Timing


def small_stage(topology):
    refs = TOPOLOGIES[topology].parts
    values = {"RA": 100e3, "RB": 330e3, "R": 100e3, "C": 1e-6}
    parts = {ref: Part(ref=ref, value=values[ref], lower_rel=-0.02, upper_rel=0.02) for ref in refs}
    ic = Ic(family="cmos")
    if topology == "schmitt":
        levels = (Threshold(value=0.58), Threshold(value=0.36))
        ic = Ic(
            family=None,
            terms={"u_threshold": 0.01},
            upper_threshold=levels[0],
            lower_threshold=levels[1],
        )
    return Stage(name="stage", topology=topology, parts=parts, ic=ic)


@pytest.mark.parametrize("topology", TOPOLOGIES)
def test_every_topology_is_diagnosed_with_the_times_it_has(topology):
    stage = small_stage(topology)
    design = make_design(stage)
    times = predict(faulty(("C-low", -0.3), board=circuit_at(stage, design)))
    names = [TOPOLOGIES[topology].run] if TOPOLOGIES[topology].run else ["t_high", "t_low"]
    timing = Timing(
        **{
            name: Measured(value=getattr(times, name), u=5e-4 * getattr(times, name), unit="s")
            for name in names
        }
    )
    found = weigh(Evidence(observations=(Observation(timing=timing),)), stage, design)
    assert "C-low" in found.groups[0].members
    assert all_sum(found) == pytest.approx(1.0, abs=1e-9)


def level(volt):
    return Reading(kind="node-level", value=volt, u=0.05, unit="V")


def test_a_board_that_stands_still_is_a_diagnosis():
    found = answer(at_rest("high"))
    assert found.stuck == "high"
    assert {"C-short", "RA-open", "RB-open", "C-leaky"} <= set(found.groups[0].members)
    assert chance(found, "healthy") == 0.0
    assert found.next[0].reading == "node-level"
    assert all_sum(found) == pytest.approx(1.0, abs=1e-9)


def test_the_nodes_level_tells_a_leak_from_an_open_part():
    """At rest 6 V: held by a leak of the charging resistance; at 0 V shorted or never charged."""
    halfway = weigh(at_rest("high", level(6.0)))
    assert halfway.best.fault in ("C-leaky", "discharge-leak")
    assert chance(halfway, "C-short") < 0.01
    empty = weigh(at_rest("high", level(0.0)))
    assert {"C-short", "RA-open", "RB-open"} <= set(empty.groups[0].members)


def test_a_board_stuck_low_has_other_suspects():
    found = weigh(at_rest("low"))
    named = {item.fault for item in found.suspects if item.probability > 0.01}
    assert {"node-leak-to-supply", "discharge-weak"} <= named
    assert "C-short" not in named
