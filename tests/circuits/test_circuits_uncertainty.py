"""The uncertainty of the products against a Monte Carlo over what it is made of."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from circuit_boards import make_design, make_stage, timing_of

from benchtool.circuits import circuit_at, coordinates, predict, solve
from benchtool.model.design import Ic, Threshold

NAMES = ("tau_charge", "tau_discharge", "tau_RA", "tau_ratio")
N_DRAWN = 200_000  # the sd of so many is known to 0.16 %
DRAWN_REL = 0.01  # and the curvature of the logarithms takes another half percent
N_SOLVED = 150  # the sd of so many is known to 5.8 %; three times that
SOLVED_REL = 0.175


def solved_by_hand(high, low, upper=2 / 3, lower=1 / 3):
    """Products of an ideal astable at its thresholds, as shares of the supply."""
    charge = high / np.log((1 - lower) / (1 - upper))
    discharge = low / np.log(upper / lower)
    return {
        "tau_charge": charge,
        "tau_discharge": discharge,
        "tau_RA": charge - discharge,
        "tau_ratio": charge / discharge,
    }


def assert_scatter(stated, solved, rel):
    for name in NAMES:
        assert getattr(stated, name).u == pytest.approx(np.std(solved[name]), rel=rel), name


def ideal_board(**terms):
    stage = make_stage(values={"RA": 47e3, "RB": 22e3, "C": 1e-6}, family=None)
    stage = replace(stage, ic=Ic(family=None, terms=terms))
    return stage, make_design(stage, supply_rel=0.0)


@pytest.mark.parametrize(("u_threshold", "u_split"), [(0.0055, 0.022), (0.006, 0.004)])
def test_threshold_spread_reaches_the_products(u_threshold, u_split):
    """The same times, solved by hand at thresholds drawn from their spread."""
    rng = np.random.default_rng(7)
    stage, design = ideal_board(u_threshold=u_threshold, u_split=u_split)
    exact = predict(circuit_at(stage, design))
    upper = 2 / 3 * (1 + rng.normal(0, u_threshold, N_DRAWN))
    lower = upper / 2 * (1 + rng.normal(0, u_split, N_DRAWN))
    solved = solved_by_hand(exact.t_high, exact.t_low, upper, lower)
    assert_scatter(solve(timing_of(exact, "t_high", "t_low"), stage, design), solved, DRAWN_REL)


def test_scatter_of_the_times_reaches_the_products():
    """Scatter of 0.5 % on each time, and a timebase error of 0.05 % that both share."""
    rng = np.random.default_rng(11)
    stage, design = ideal_board()
    exact = predict(circuit_at(stage, design))
    base, high, low = (1 + rng.normal(0, u, N_DRAWN) for u in (5e-4, 5e-3, 5e-3))
    solved = solved_by_hand(exact.t_high * base * high, exact.t_low * base * low)
    timing = timing_of(exact, "t_high", "t_low", u_rel=5e-3)
    assert_scatter(solve(timing, stage, design), solved, DRAWN_REL)


def drawn_ic(stage, spread, rng):
    """An IC with every term drawn from the family's spread."""
    upper = 2 / 3 * (1 + rng.normal(0, spread["upper_threshold"].u))
    lower = upper / 2 * (1 + rng.normal(0, spread["threshold_split"].u))
    terms = {
        name: rng.normal(item.centre, item.u)
        if item.law == "normal"
        else rng.uniform(0, item.upper)
        for name, item in spread.items()
        if item.kind == "ic" and name not in ("upper_threshold", "threshold_split")
    }
    thresholds = (Threshold(value=upper), Threshold(value=lower))
    return Ic(
        family=stage.ic.family,
        terms=terms,
        upper_threshold=thresholds[0],
        lower_threshold=thresholds[1],
    )


def test_spread_of_every_ic_term_reaches_the_products():
    """The same times solved for one IC after another; large resistors, so that bias matters."""
    rng = np.random.default_rng(13)
    stage = make_stage(values={"RA": 1e6, "RB": 2e6, "C": 1e-6}, family="bipolar")
    design = make_design(stage, 5.0, supply_rel=0.0)
    known = {"RB": 2e6}
    spread = {item.name: item for item in coordinates(stage, design)}
    timing = timing_of(predict(circuit_at(stage, design)), "t_high", "t_low", u_rel=1e-6)
    stated = solve(timing, stage, design, known=known)
    found = [
        solve(timing, replace(stage, ic=drawn_ic(stage, spread, rng)), design, known=known)
        for _ in range(N_SOLVED)
    ]
    solved = {name: [getattr(item, name).value for item in found] for name in NAMES}
    assert_scatter(stated, solved, SOLVED_REL)


def test_an_error_both_times_share_cancels_in_the_ratio():
    stage = make_stage(family=None)
    design = make_design(stage, supply_rel=0.0)
    found = solve(timing_of(predict(circuit_at(stage, design)), "t_high", "t_low"), stage, design)
    timing = timing_of(predict(circuit_at(stage, design)), "t_high", "t_low", u_rel=1e-4)
    shared = {
        item.source: item.u for item in solve(timing, stage, design).tau_ratio.budget if item.common
    }
    assert abs(shared.get("timebase", 0.0)) < 1e-9
    assert found.tau_ratio.u == 0.0


def test_absolute_products_are_known_to_about_two_percent():
    """Threshold spread alone: the design notes' figure for bipolar; CMOS is better."""
    for family, low, high in (("bipolar", 0.015, 0.025), ("cmos", 0.010, 0.015)):
        stage = make_stage(values={"RA": 10e3, "RB": 33e3, "C": 1e-6}, family=family)
        design = make_design(stage, 12.0)
        timing = timing_of(predict(circuit_at(stage, design)), "t_high", "t_low", u_rel=1e-5)
        tau = solve(timing, stage, design).tau_charge
        assert low < tau.u / tau.value < high


def test_the_budget_names_the_ic_terms_as_common():
    stage = make_stage(family="bipolar")
    timing = timing_of(
        predict(circuit_at(stage, make_design(stage))), "t_high", "t_low", u_rel=1e-4
    )
    tau = solve(timing, stage, make_design(stage)).tau_charge
    lines = {item.source: item for item in tau.budget}
    for source in ("upper threshold", "threshold split", "bias current", "discharge leakage"):
        assert lines[source].common
        assert lines[source].note
    assert tau.u == pytest.approx(math.sqrt(sum(item.u**2 for item in tau.budget)), rel=1e-12)
    # closed form: dln tau_c = -2.164 per relative VU
    assert lines["upper threshold"].u / tau.value == pytest.approx(-2.164 * 0.0055, rel=0.03)


def test_the_tolerance_of_the_parts_taken_as_marked_is_in_the_estimate():
    stage = make_stage(family=None)
    design = make_design(stage, supply_rel=0.0)
    timing = timing_of(predict(circuit_at(stage, design)), "t_high", "t_low")
    part = solve(timing, stage, design).parts[2]
    sources = {item.source for item in part.estimate.budget}
    assert sources == {"tolerance of RA", "tolerance of RB"}
    known = solve(timing, stage, design, known={"RA": 100e3}).parts[-1]
    assert known.ref == "C"
    assert known.estimate.u == pytest.approx(0.0, abs=1e-15)
