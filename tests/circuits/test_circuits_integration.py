"""The closed forms against Kirchhoff's law integrated numerically, every term included."""

from __future__ import annotations

import math

import numpy as np
import pytest
from circuit_kirchhoff import integrated_times

from benchtool.circuits import TOPOLOGIES, Circuit, predict

# The integrator works at 1e-11; the kink where a steering diode hands over costs it two digits.
REL = 1e-8

IDEAL = {"supply": 12.0, "v_upper": 8.0, "v_lower": 4.0, "C": 10e-9}
RESISTORS = {
    "astable": {"RA": 22e3, "RB": 47e3},
    "astable-diode": {"RA": 22e3, "RB": 47e3, "diode_drop": 0.55},
    "output-fed": {"R": 47e3},
    "schmitt": {"R": 47e3},
    "one-shot": {"R": 47e3},
    "power-on": {"R": 47e3},
}
TERMS = {
    "ideal": {},
    "switch": {"v_sat": 0.05, "r_on": 900.0, "i_discharge_leak": 4e-6},
    "output": {
        "output_high_drop": 1.5,
        "output_high_resistance": 800.0,
        "output_low": 0.2,
        "output_low_resistance": 400.0,
    },
    "bias": {"i_bias": 6e-6, "i_leak": 3e-6},
    "leak to ground": {"leak_ohm": 470e3},
    "leak to supply": {"leak_ohm": 300e3, "leak_to_v": 12.0},
    "probe": {"probe_r": 1e6, "probe_c": 1e-9},
    "delays": {"delay_upper": 20e-6, "delay_lower": 35e-6},
    "series resistance": {"esr": 2e3},
    "all but the probe's capacitance": {
        "v_sat": 0.04,
        "r_on": 300.0,
        "i_discharge_leak": 1e-6,
        "output_high_drop": 0.4,
        "output_low": 0.1,
        "output_high_resistance": 90.0,
        "output_low_resistance": 70.0,
        "i_bias": 1e-6,
        "leak_ohm": 1e6,
        "leak_to_v": 5.0,
        "probe_r": 10e6,
        "shunt_ohm": 3e6,
        "delay_upper": 8e-6,
        "delay_lower": 5e-6,
        "esr": 300.0,
    },
}


def assert_same(circuit: Circuit) -> None:
    prediction = predict(circuit)
    truth = integrated_times(circuit)
    assert prediction.stuck is None
    for name, value in truth.items():
        assert getattr(prediction, name) == pytest.approx(value, rel=REL), name


@pytest.mark.parametrize("terms", TERMS.values(), ids=TERMS.keys())
@pytest.mark.parametrize("topology", TOPOLOGIES)
def test_closed_form_is_what_integration_gives(topology, terms):
    figures = {**IDEAL, **RESISTORS[topology], **terms}
    assert_same(Circuit(topology=topology, **figures))


@pytest.mark.parametrize(
    ("supply", "RA", "RB", "delay"),
    [
        (5.0, 30e3, 10e3, 0.0),  # hands over between the thresholds
        (15.0, 10e3, 47e3, 0.0),  # the diode carries it all the way
        (5.0, 100e3, 6.8e3, 0.0),  # over before the lower threshold
        (15.0, 30e3, 4e3, 90e-6),  # hands over during the delay
    ],
)
def test_steering_diode_hands_over_where_its_current_ends(supply, RA, RB, delay):
    assert_same(
        Circuit(
            topology="astable-diode",
            supply=supply,
            v_upper=supply * 2 / 3,
            v_lower=supply / 3,
            RA=RA,
            RB=RB,
            C=10e-9,
            diode_drop=0.55,
            delay_upper=delay,
        )
    )


def test_one_logarithm_for_a_steering_diode_would_be_off_by_four_percent():
    """RA 30k, RB 10k, 5 V, 0.6 V: the diode stops conducting between the thresholds."""
    circuit = Circuit(
        topology="astable-diode",
        supply=5.0,
        v_upper=10 / 3,
        v_lower=5 / 3,
        RA=30e3,
        RB=10e3,
        C=10e-9,
        diode_drop=0.6,
    )
    settles_v = 5 - 0.6
    alone = 30e3 * 10e-9 * math.log((settles_v - 5 / 3) / (settles_v - 10 / 3))
    assert alone / predict(circuit).t_high - 1 == pytest.approx(0.04, abs=0.005)


def test_series_diode_charges_in_one_segment():
    terms = TERMS["all but the probe's capacitance"]
    figures = {**IDEAL, **RESISTORS["astable-diode"], **terms, "series_diode_drop": 0.6}
    assert_same(Circuit(topology="astable-diode", **figures))


@pytest.mark.parametrize("topology", TOPOLOGIES)
def test_random_boards_agree_with_integration(topology):
    rng = np.random.default_rng(20310302)
    for _ in range(3):
        assert_same(random_circuit(topology, rng))


def random_circuit(topology: str, rng: np.random.Generator) -> Circuit:
    def between(low: float, high: float) -> float:
        return float(math.exp(rng.uniform(math.log(low), math.log(high))))

    supply, r = between(4.5, 16), between(5e3, 200e3)
    refs = ("RA", "RB") if "astable" in topology else ("R",)
    return Circuit(
        topology=topology,
        supply=supply,
        v_upper=supply * rng.uniform(0.55, 0.7),
        v_lower=supply * rng.uniform(0.25, 0.4),
        C=(c := between(1e-9, 1e-6)),
        esr=r * rng.uniform(0, 0.02),
        v_sat=supply * rng.uniform(0, 0.01),
        r_on=r * rng.uniform(0, 0.02),
        i_discharge_leak=supply / r * rng.uniform(0, 0.02),
        i_bias=supply / r * rng.uniform(0, 0.02),
        i_leak=supply / r * rng.uniform(0, 0.02),
        delay_upper=r * c * rng.uniform(0, 0.05),
        delay_lower=r * c * rng.uniform(0, 0.05),
        output_high_drop=supply * rng.uniform(0, 0.05),
        output_low=supply * rng.uniform(0, 0.02),
        diode_drop=rng.uniform(0.4, 0.6),
        leak_ohm=r * between(20, 200),
        leak_to_v=rng.uniform(0, supply),
        **{ref: r * rng.uniform(0.5, 1.5) for ref in refs},
    )


def test_rows_of_boards_give_what_each_board_gives():
    figures = {**IDEAL, **RESISTORS["astable-diode"], **TERMS["bias"]}
    drops = np.linspace(0.0, 1.5, 7)
    together = predict(Circuit(topology="astable-diode", **{**figures, "diode_drop": drops}))
    for index, drop in enumerate(drops):
        alone = predict(Circuit(topology="astable-diode", **{**figures, "diode_drop": drop}))
        assert together.t_high[index] == pytest.approx(alone.t_high, rel=1e-14)  # rounding
        assert together.period[index] == pytest.approx(alone.period, rel=1e-14)
