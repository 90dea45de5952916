"""What may vary on a board, and what moves with it."""

from __future__ import annotations

import math

import numpy as np
import pytest
from circuit_boards import make_design, make_stage

from benchtool.circuits import circuit_at, coordinates, find_family, predict, term_origin
from benchtool.circuits.families import TERM_UNITS
from benchtool.errors import DesignError, UsageError
from benchtool.model.design import Band, Design, Ic, Part, Probe, Stage, Threshold


def by_name(stage, design):
    return {item.name: item for item in coordinates(stage, design)}


def test_parts_and_supply_are_rectangular_within_their_limits():
    stage = make_stage(leakage_a=0.5e-6)
    found = by_name(stage, make_design(stage))
    assert (found["C"].lower, found["C"].centre, found["C"].upper) == pytest.approx(
        (42.3e-6, 47e-6, 51.7e-6)
    )
    assert found["C"].u == pytest.approx(4.7e-6 / math.sqrt(3))
    assert found["supply"].kind == "supply"
    assert (found["supply"].lower, found["supply"].upper) == pytest.approx((11.4, 12.6))


def test_a_leakage_is_a_maximum_of_which_half_is_nominal():
    stage = make_stage(leakage_a=0.5e-6)
    found = by_name(stage, make_design(stage))["leakage"]
    assert (found.lower, found.centre, found.upper) == (0.0, 0.25e-6, 0.5e-6)
    assert circuit_at(stage, make_design(stage)).i_leak == 0.25e-6


def test_ic_terms_reach_two_u_and_bias_zero_to_its_published_value():
    stage = make_stage(family="bipolar")
    found = by_name(stage, make_design(stage))
    threshold = found["upper_threshold"]
    assert (threshold.lower, threshold.upper) == (-2 * threshold.u, 2 * threshold.u)
    assert threshold.law == "normal"
    assert threshold.u == 0.0055
    assert found["threshold_split"].u == 0.022
    assert (found["bias_current"].lower, found["bias_current"].upper) == pytest.approx((0, 30e-9))
    assert found["bias_current"].law == "rectangular"


def test_only_what_acts_and_varies_is_a_coordinate():
    cmos = by_name(make_stage(), make_design(make_stage()))
    assert "bias_current" not in cmos  # 0
    assert "temperature" not in cmos  # no part has a coefficient
    assert "leakage" not in cmos
    assert "output_high_drop" not in cmos  # does not act in an astable
    fed = make_stage("output-fed", {"R": 1e5, "C": 1e-6}, family="bipolar")
    assert "output_high_drop" in by_name(fed, make_design(fed))
    delay = make_stage("power-on", {"R": 1e5, "C": 1e-6})
    assert "threshold_split" not in by_name(delay, make_design(delay))


def test_no_family_means_no_spread_and_ideal_terms():
    stage = make_stage(family=None)
    assert set(by_name(stage, make_design(stage))) == {"RA", "RB", "C", "supply"}
    circuit = circuit_at(stage, make_design(stage))
    assert (circuit.r_on, circuit.v_sat, circuit.delay_upper) == (0.0, 0.0, 0.0)
    assert circuit.v_upper == pytest.approx(8.0)


def test_every_family_states_every_term_with_its_origin():
    for name in ("bipolar", "cmos"):
        family = find_family(name)
        assert set(family.terms) == set(TERM_UNITS)
        assert all(term.origin for term in family.terms.values())
    with pytest.raises(UsageError, match="no IC family"):
        find_family("nmos")


@pytest.mark.parametrize(
    ("term", "field"),
    [
        ("discharge_saturation", "v_sat"),
        ("discharge_resistance", "r_on"),
        ("discharge_leakage", "i_discharge_leak"),
        ("bias_current", "i_bias"),
        ("delay_upper", "delay_upper"),
        ("delay_lower", "delay_lower"),
    ],
)
def test_a_stated_term_replaces_the_familys(term, field):
    stage = make_stage()
    stated = Stage(
        name="s",
        topology="astable",
        parts=stage.parts,
        ic=Ic(family="bipolar", terms={term: 1.25e-3}),
    )
    assert getattr(circuit_at(stated, make_design(stated)), field) == 1.25e-3
    assert term_origin(stated, term) == "stated in the design"
    assert term_origin(stage, term) == find_family("cmos").terms[term].origin


def test_stated_terms_of_the_output_and_the_thresholds():
    stage = make_stage("schmitt", {"R": 1e5, "C": 1e-6})
    terms = {
        "u_threshold": 0.02,
        "output_high_drop": 0.3,
        "output_high_resistance": 90.0,
        "output_low": 0.1,
        "output_low_resistance": 50.0,
    }
    upper, lower = Threshold(value=7.1, of_supply=False), Threshold(value=0.35)
    ic = Ic(family=None, terms=terms, upper_threshold=upper, lower_threshold=lower)
    stated = Stage(name="s", topology="schmitt", parts=stage.parts, ic=ic)
    circuit = circuit_at(stated, make_design(stated))
    assert (circuit.v_upper, circuit.v_lower) == pytest.approx((7.1, 4.2))
    assert circuit.output_high_drop == 0.3
    assert circuit.output_high_resistance == 90.0
    assert (circuit.output_low, circuit.output_low_resistance) == (0.1, 50.0)
    found = by_name(stated, make_design(stated))
    assert found["upper_threshold"].u == 0.02
    assert found["threshold_split"].u == 0.02  # no divider ties the lower one


def test_a_schmitt_without_thresholds_is_a_design_error():
    stage = make_stage("schmitt", {"R": 1e5, "C": 1e-6})
    bare = Stage(name="s", topology="schmitt", parts=stage.parts, ic=Ic(family="cmos"))
    with pytest.raises(DesignError, match="thresholds"):
        circuit_at(bare, make_design(bare))


def test_a_forced_control_pin_sets_the_upper_threshold_and_the_lower_follows():
    stage = make_stage(control_v=6.0)
    circuit = circuit_at(stage, make_design(stage))
    assert (circuit.v_upper, circuit.v_lower) == (6.0, 3.0)
    at_other_supply = circuit_at(stage, make_design(stage), {"supply": 11.4})
    assert at_other_supply.v_upper == 6.0
    ideal = make_stage(control_v=6.0, family=None)
    times = predict(circuit_at(ideal, make_design(ideal)))
    # SLFS022 form: C(RA+RB) ln(1 + Vc/(2(V - Vc))), t_low unchanged
    assert times.t_high == pytest.approx(430e3 * 47e-6 * math.log(1 + 6 / (2 * 6)), rel=1e-12)
    assert times.t_low == pytest.approx(330e3 * 47e-6 * math.log(2), rel=1e-12)


def test_thresholds_follow_the_supply_and_ideal_times_do_not():
    stage = make_stage(family=None)
    design = make_design(stage)
    low, high = (circuit_at(stage, design, {"supply": volts}) for volts in (5.0, 15.0))
    assert low.v_upper == pytest.approx(10 / 3)
    assert predict(low).t_high == pytest.approx(predict(high).t_high, rel=1e-12)


def test_split_moves_the_lower_threshold_alone_and_upper_takes_it_along():
    stage = make_stage()
    design = make_design(stage)
    split = circuit_at(stage, design, {"threshold_split": 0.1})
    assert (split.v_upper, split.v_lower) == pytest.approx((8.0, 4.4))
    both = circuit_at(stage, design, {"upper_threshold": 0.1})
    assert (both.v_upper, both.v_lower) == pytest.approx((8.8, 4.4))


def test_all_parts_share_one_temperature():
    parts = {
        "RA": Part(ref="RA", value=100e3, tempco_per_k=100e-6),
        "RB": Part(ref="RB", value=330e3),
        "C": Part(ref="C", value=47e-6, tempco_per_k=-1e-3),
    }
    stage = Stage(name="s", topology="astable", parts=parts, ic=Ic(family=None))
    band = Band(nominal=25.0, lower=10.0, upper=40.0)
    design = Design(
        name="d", supply=Band(nominal=12, lower=12, upper=12), stages=(stage,), temperature=band
    )
    found = by_name(stage, design)["temperature"]
    assert (found.lower, found.centre, found.upper) == (10.0, 25.0, 40.0)
    warm = circuit_at(stage, design, {"temperature": 40.0})
    parts_warm = [warm.RA, warm.RB, warm.C]
    assert parts_warm == pytest.approx([100e3 * 1.0015, 330e3, 47e-6 * 0.985], rel=1e-12)
    assert circuit_at(stage, design).C == 47e-6


def test_a_probe_loads_the_node_only_where_it_sits_there():
    stage = make_stage()
    on_output = circuit_at(stage, make_design(stage, probe=Probe(r_ohm=10e6, c_f=12e-12)))
    assert math.isinf(on_output.probe_r)
    probe = Probe(r_ohm=10e6, c_f=12e-12, at="capacitor")
    on_node = circuit_at(stage, make_design(stage, probe=probe))
    assert (on_node.probe_r, on_node.probe_c) == (10e6, 12e-12)


def test_diode_drop_follows_its_current_unless_stated():
    values = {"RA": 6e3, "RB": 10e3, "C": 1e-6}
    stage = make_stage("astable-diode", values)
    design = make_design(stage)
    assert circuit_at(stage, design).diode_drop == pytest.approx(0.6, abs=1e-12)  # 1 mA
    assert by_name(stage, design)["diode_drop"].u == 0.05
    stated = make_stage("astable-diode", values, diode_drop_v=0.3, series_diode_drop_v=0.35)
    assert circuit_at(stated, design).diode_drop == 0.3
    assert circuit_at(stated, design).series_diode_drop == 0.35


def test_a_point_of_arrays_gives_a_row_of_boards():
    stage = make_stage(family="bipolar")
    design = make_design(stage)
    rng = np.random.default_rng(3)
    point = {
        item.name: rng.uniform(item.lower, item.upper, 50) for item in coordinates(stage, design)
    }
    row = predict(circuit_at(stage, design, point))
    alone = predict(circuit_at(stage, design, {k: float(v[17]) for k, v in point.items()}))
    assert row.period.shape == (50,)
    assert row.period[17] == pytest.approx(alone.period, rel=1e-14)  # rounding


def test_a_name_that_is_no_coordinate_is_refused():
    stage = make_stage()
    with pytest.raises(ValueError, match="RC"):
        circuit_at(stage, make_design(stage), {"RC": 1.0})


def test_divided_outputs_have_period_and_frequency_only():
    stage = make_stage(divide=8)
    plain = make_stage()
    times = predict(circuit_at(stage, make_design(stage)))
    once = predict(circuit_at(plain, make_design(plain)))
    assert times.period == pytest.approx(8 * once.period, rel=1e-12)
    assert times.frequency == pytest.approx(once.frequency / 8, rel=1e-12)
    assert (times.t_high, times.t_low, times.duty, times.first_high) == (None,) * 4
