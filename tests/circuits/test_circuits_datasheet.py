"""Published timer figures, forward and inverse; sources in tests/reference/timer_figures.toml."""

from __future__ import annotations

import math
import tomllib
from dataclasses import replace
from pathlib import Path

import pytest
from circuit_boards import make_design, make_stage, measured, timing_of

from benchtool.circuits import (
    FAMILIES,
    Circuit,
    circuit_at,
    coordinates,
    predict,
    sensitivities,
    solve,
    solve_without_design,
)
from benchtool.model.design import Ic
from benchtool.model.timing import Timing

FIGURES = tomllib.loads(
    (Path(__file__).parents[1] / "reference" / "timer_figures.toml").read_text(encoding="utf-8")
)
ASTABLE_FIGURE, ONE_SHOT_FIGURE = FIGURES["waveform"]
ROUNDED_LN2 = 2.2e-4  # 0.693 for ln 2
ROUNDED_LN3 = 1.3e-3  # 1.1 for ln 3
ROUNDED_1_44 = 1.9e-3  # 1.44 for 1/ln 2
IDEAL_IC = Ic(family=None)


def ideal(topology: str, supply: float = 15.0, **parts: float) -> Circuit:
    return Circuit(
        topology=topology, supply=supply, v_upper=supply * 2 / 3, v_lower=supply / 3, **parts
    )


def test_astable_waveform_forward():
    figure = ASTABLE_FIGURE
    times = predict(ideal("astable", RA=figure["RA"], RB=figure["RB"], C=figure["C"]))
    assert times.t_high == pytest.approx(figure["t_high_s"], rel=1e-6)  # six printed digits
    assert times.t_low == pytest.approx(figure["t_low_s"], rel=2e-6)
    assert times.duty == pytest.approx(figure["duty"], rel=1e-5)
    assert times.t_high == pytest.approx(figure["printed_t_high_s"], rel=ROUNDED_LN2)
    assert times.t_low == pytest.approx(figure["printed_t_low_s"], rel=ROUNDED_LN2)


def test_astable_waveform_inverse():
    figure = ASTABLE_FIGURE
    timing = Timing(t_high=measured(figure["t_high_s"]), t_low=measured(figure["t_low_s"]))
    found = solve_without_design(timing, "astable", ic=IDEAL_IC, supply_v=15.0)
    assert found.tau_charge.value == pytest.approx(8e3 * 0.15e-6, rel=1e-6)
    assert found.tau_discharge.value == pytest.approx(3e3 * 0.15e-6, rel=2e-6)
    assert found.tau_RA.value == pytest.approx(5e3 * 0.15e-6, rel=5e-6)


def test_one_shot_waveform_both_ways():
    figure = ONE_SHOT_FIGURE
    times = predict(ideal("one-shot", R=figure["R"], C=figure["C"]))
    assert times.t_high == pytest.approx(figure["t_high_s"], rel=5e-6)  # five printed digits
    assert times.t_high == pytest.approx(figure["printed_t_high_s"], rel=ROUNDED_LN3)
    timing = Timing(t_high=measured(figure["t_high_s"]))
    found = solve_without_design(timing, "one-shot", ic=IDEAL_IC)
    assert found.tau_charge.value == pytest.approx(9.1e3 * 0.01e-6, rel=5e-6)


def test_ideal_first_high_and_ratio_are_logarithms_of_three_and_two():
    times = predict(ideal("astable", RA=100e3, RB=330e3, C=47e-6))
    assert times.first_high == pytest.approx(430e3 * 47e-6 * math.log(3), rel=1e-12)
    assert times.first_high / times.t_high == pytest.approx(1.58496, abs=5e-6)


def published_precise(RA: float, RB: float, C: float, r_on: float, delays: tuple[float, float]):
    """SLFS043C, page 12: the formulas for high frequencies, tPHL and tPLH being the delays."""
    t_phl, t_plh = delays
    high = C * (RA + RB) * math.log(3 - math.exp(-t_plh / (C * (RB + r_on)))) + t_phl
    low = C * (RB + r_on) * math.log(3 - math.exp(-t_phl / (C * (RA + RB)))) + t_plh
    return high, low


@pytest.mark.parametrize("C", [200e-12, 1e-9, 100e-9])
def test_cmos_precise_formulas_are_the_model_without_the_switch_under_ra(C):
    """The published form puts the switch's foot at 0 V and its resistance in series with RB."""
    circuit = Circuit(
        topology="astable",
        supply=5.0,
        v_upper=10 / 3,
        v_lower=5 / 3,
        RA=470.0,
        RB=214.0,  # 200 ohm and an on-resistance of 14 ohm in one: the same discharge
        C=C,
        delay_upper=0.12e-6,
        delay_lower=0.16e-6,
    )
    # Charging, the published form has RB alone: 14 ohm less in RA makes up for it.
    high, low = published_precise(470.0 + 14.0, 200.0, C, 14.0, (0.12e-6, 0.16e-6))
    times = predict(circuit)
    assert times.t_high == pytest.approx(high, rel=1e-12)
    assert times.t_low == pytest.approx(low, rel=1e-12)


def test_full_switch_differs_from_the_published_form_by_its_foot():
    """With RA far above the on-resistance both agree; at 470 ohm the foot shows."""
    near = Circuit(
        topology="astable",
        supply=5.0,
        v_upper=10 / 3,
        v_lower=5 / 3,
        RA=1e6,
        RB=200e3,
        C=1e-9,
        r_on=14.0,
        delay_upper=0.14e-6,
        delay_lower=0.14e-6,
    )
    high, low = published_precise(1e6, 200e3, 1e-9, 14.0, (0.14e-6, 0.14e-6))
    assert predict(near).t_high == pytest.approx(high, rel=1e-6)
    assert predict(near).t_low == pytest.approx(low, rel=1e-4)  # foot: 14 ohm under 1 Mohm
    fast = replace(near, RA=470.0, RB=200.0, C=200e-12)
    _, low = published_precise(470.0, 200.0, 200e-12, 14.0, (0.14e-6, 0.14e-6))
    assert predict(fast).t_low / low - 1 > 0.005


def test_cmos_family_reaches_the_published_highest_frequency():
    """2.1 MHz typical; the plain formula would give 8.3 MHz. The delay was set from this figure."""
    figure = FIGURES["cmos_highest_frequency"]
    stage = make_stage(values={ref: figure[ref] for ref in ("RA", "RB", "C")})
    times = predict(circuit_at(stage, make_design(stage, 5.0)))
    assert times.frequency == pytest.approx(figure["typical_hz"], rel=0.03)  # two printed digits
    assert times.frequency > figure["least_hz"]


def test_highest_frequency_solves_back_to_the_marked_parts():
    figure = FIGURES["cmos_highest_frequency"]
    stage = make_stage(values={ref: figure[ref] for ref in ("RA", "RB", "C")})
    design = make_design(stage, 5.0)
    timing = timing_of(predict(circuit_at(stage, design)), "t_high", "t_low")
    found = solve(timing, stage, design)
    assert found.tau_charge.value == pytest.approx(670 * 200e-12, rel=1e-9)
    assert found.tau_discharge.value == pytest.approx(200 * 200e-12, rel=1e-9)


def test_frequency_chart():
    chart = FIGURES["frequency_chart"]
    for total, row in zip(chart["r_ohm"], chart["f_hz"], strict=True):
        for c, hertz in zip(chart["c_f"], row, strict=True):
            times = predict(ideal("astable", RA=total / 2, RB=total / 4, C=c))
            assert times.frequency == pytest.approx(hertz, rel=ROUNDED_1_44)


def test_pulse_chart_both_ways():
    chart = FIGURES["pulse_chart"]
    for r, row in zip(chart["r_ohm"], chart["t_s"], strict=True):
        for c, seconds in zip(chart["c_f"], row, strict=True):
            assert predict(ideal("one-shot", R=r, C=c)).t_high == pytest.approx(
                seconds, rel=ROUNDED_LN3
            )
            timing = Timing(t_high=measured(seconds))
            found = solve_without_design(timing, "one-shot", ic=IDEAL_IC, known={"C": c})
            assert found.tau_charge.value == pytest.approx(r * c, rel=ROUNDED_LN3)
            assert found.parts[0].estimate.value == pytest.approx(r, rel=ROUNDED_LN3)


def test_bipolar_switch_is_the_line_through_the_published_points():
    points, terms = FIGURES["saturation"], FAMILIES["bipolar"].terms
    for current, voltage in zip(points["current_a"], points["voltage_v"], strict=True):
        line = terms["discharge_saturation"].value + terms["discharge_resistance"].value * current
        # Two digits each: half of the last, 0.5 mV and 0.05 ohm times the current.
        assert line == pytest.approx(voltage, abs=0.5e-3 + 0.05 * current)


def test_cmos_on_resistance_goes_through_the_published_points():
    points, term = FIGURES["cmos_on_voltage"], FAMILIES["cmos"].terms["discharge_resistance"]
    ohms = [v / i for v, i in zip(points["voltage_v"], points["current_a"], strict=True)]
    for supply, ohm in zip(points["supply_v"], ohms, strict=True):
        assert term.at(supply) == pytest.approx(ohm, rel=1e-3)
    assert ohms[1] < term.at(9.0) < ohms[0]


def astable_error(family: str) -> float:
    """Relative u of the period of an astable with RA = RB from the thresholds alone."""
    stage = make_stage(values={"RA": 10e3, "RB": 10e3, "C": 0.1e-6}, family=family)
    design = make_design(stage, 15.0)
    slopes = sensitivities(circuit_at(stage, design))
    u = {item.name: item.u for item in coordinates(stage, design)}
    common = slopes["thresholds"].period * u["upper_threshold"]
    return math.hypot(common, slopes["v_lower"].period * u["threshold_split"])


def test_threshold_spread_is_the_published_initial_error():
    published = FIGURES["initial_error"]
    assert astable_error("bipolar") == pytest.approx(published["bipolar_astable"], rel=0.03)
    # The one published CMOS figure stands for one-shot and astable alike.
    assert astable_error("cmos") == pytest.approx(published["cmos_astable"], rel=0.10)
    u_upper = FAMILIES["bipolar"].terms["u_threshold"].value
    one_shot = predict(ideal("one-shot", R=10e3, C=0.1e-6))
    high = replace(ideal("one-shot", R=10e3, C=0.1e-6), v_upper=10.0 * (1 + u_upper))
    change = predict(high).t_high / one_shot.t_high - 1
    assert change == pytest.approx(published["bipolar_one_shot"], rel=0.03)


def test_leakage_at_its_usual_limit_lengthens_high_and_shortens_low():
    figure = FIGURES["leakage_limit"]
    RB = figure["r_discharge_ohm"]
    clean = ideal(
        "astable", figure["supply_v"], RA=figure["r_charge_ohm"] - RB, RB=RB, C=figure["C"]
    )
    before, after = predict(clean), predict(replace(clean, i_leak=figure["leakage_a"]))
    assert after.t_high / before.t_high - 1 == pytest.approx(figure["t_high_change"], abs=5e-4)
    assert after.t_low / before.t_low - 1 == pytest.approx(figure["t_low_change"], abs=5e-4)
