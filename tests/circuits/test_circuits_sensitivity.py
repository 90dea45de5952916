"""Sensitivities against the table of the design notes (three printed digits) and exact forms."""

from __future__ import annotations

import math

import pytest

from benchtool.circuits import Circuit, sensitivities

V, RA, RB, R = 12.0, 100e3, 330e3, 47e3
ASTABLE = Circuit(topology="astable", supply=V, v_upper=8.0, v_lower=4.0, RA=RA, RB=RB, C=47e-6)
ONE_SHOT = Circuit(topology="one-shot", supply=V, v_upper=8.0, R=R, C=47e-6)

PRINTED = 6e-4  # half of the last printed digit, and the rounding of a sum of two

# figure -> (dln t_high, dln t_low, dln one-shot), each for one unit of the figure
TABLE = {
    "shunt": (1.164 * (RA + RB), -RB, 0.820 * R),
    "i_leak": (2.164 * (RA + RB) / V, -2.164 * RB / V, 1.820 * R / V),
    "thresholds": (2.164, 0.0, 1.820),
    "v_upper": (2.885, 1.443, 1.820),
    "v_lower": (-0.721, -1.443, 0.0),
    "v_sat": (0.0, 2.164 / V, -0.910 / V),
    "esr": (
        -0.443 / (RA + RB) - 0.721 / RB,
        -0.443 / RB - 0.721 / (RA + RB),
        0.090 / R,
    ),
}


@pytest.mark.parametrize("figure", TABLE)
def test_table_of_sensitivities(figure):
    high, low, pulse = TABLE[figure]
    astable, one_shot = sensitivities(ASTABLE)[figure], sensitivities(ONE_SHOT)[figure]
    scale = max(abs(high), abs(low))
    assert astable.t_high == pytest.approx(high, rel=PRINTED, abs=PRINTED * scale)
    assert astable.t_low == pytest.approx(low, rel=PRINTED, abs=PRINTED * scale)
    # 0.090 has two digits only
    assert one_shot.t_high == pytest.approx(pulse, rel=3e-3, abs=PRINTED * scale * 1e-3)


def test_exact_forms_behind_the_table():
    ln2, ln3 = math.log(2), math.log(3)
    astable, one_shot = sensitivities(ASTABLE), sensitivities(ONE_SHOT)
    assert astable["thresholds"].t_high == pytest.approx(1.5 / ln2, rel=1e-8)
    assert astable["v_upper"].t_low == pytest.approx(1 / ln2, rel=1e-8)
    assert one_shot["v_upper"].t_high == pytest.approx(2 / ln3, rel=1e-8)
    assert one_shot["v_sat"].t_high == pytest.approx(-1 / ln3 / V, rel=1e-8)


def test_parts_move_their_times_by_their_share():
    slopes = sensitivities(ASTABLE)
    assert slopes["C"].t_high == pytest.approx(1.0, rel=1e-9)
    assert slopes["C"].t_low == pytest.approx(1.0, rel=1e-9)
    assert slopes["RA"].t_high == pytest.approx(RA / (RA + RB), rel=1e-9)
    assert slopes["RA"].t_low == pytest.approx(0.0, abs=1e-9)
    assert slopes["RB"].t_high == pytest.approx(RB / (RA + RB), rel=1e-9)
    assert slopes["RB"].period == pytest.approx(2 * RB / (RA + 2 * RB), rel=1e-9)


def test_times_and_parts_that_a_topology_lacks_are_absent():
    slopes = sensitivities(ONE_SHOT)
    assert "RA" not in slopes
    assert slopes["R"].t_low is None
    assert slopes["R"].delay is None


def test_delays_add_themselves_and_their_overshoot():
    slopes = sensitivities(ASTABLE)
    t_high, t_low = 430e3 * 47e-6 * math.log(2), 330e3 * 47e-6 * math.log(2)
    assert slopes["delay_upper"].t_high == pytest.approx(1 / t_high, rel=1e-6)
    # VU' rises by (V - VU)/tau_c a second, which takes tau_d/VU a volt to undo
    overshoot = (V - 8.0) / (430e3 * 47e-6) * (330e3 * 47e-6) / 8.0
    assert slopes["delay_upper"].t_low == pytest.approx(overshoot / t_low, rel=1e-5)
