from __future__ import annotations

import math

import numpy as np
import pytest
from node_boards import (
    FAST,
    as_node,
    board,
    integrated,
    ohms,
    recorded,
    remembering,
    seconds,
    with_noise,
)

from benchtool.circuits import settle_states
from benchtool.errors import MeasurementError
from benchtool.model.capture import ArraySamples, Span, UniformTime, Waveform
from benchtool.model.node import NodeFit
from benchtool.model.quantity import Measured
from benchtool.node import Terms, esr_ohm, fit_node, node_readings
from benchtool.uncertainty import expanded

RISE_OHM, FALL_OHM = 430e3, 330e3


def figures(fit: NodeFit) -> dict[str, Measured]:
    assert fit.charge
    assert fit.discharge
    assert fit.upper
    assert fit.lower
    return {
        "charge end": fit.charge.end,
        "charge tau": fit.charge.tau,
        "discharge end": fit.discharge.end,
        "discharge tau": fit.discharge.tau,
        "upper": fit.upper,
        "lower": fit.lower,
    }


def truth(scale: float, **changes: float) -> dict[str, float]:
    circuit = board(scale, **changes)
    states = settle_states(circuit)
    assert states.discharge
    return {
        "charge end": float(states.charge[0].v),
        "charge tau": float(states.charge[0].tau),
        "discharge end": float(states.discharge.v),
        "discharge tau": float(states.discharge.tau),
        "upper": float(circuit.v_upper),
        "lower": float(circuit.v_lower),
    }


@pytest.mark.parametrize(
    ("scale", "periods", "changes"),
    [
        (1.0, 4, {}),
        (FAST, 30, {}),
        (FAST, 12, {"shunt_ohm": 3e6}),
        (FAST, 12, {"leak_ohm": 4e6, "leak_to_v": 12.0}),
    ],
)
def test_the_figures_of_the_node_are_those_of_the_circuit(
    scale: float, periods: float, changes: dict[str, float]
) -> None:
    """Slow and fast, healthy, leaking to 0 V and to the supply."""
    z, true = [], truth(scale, **changes)
    for seed in range(4):
        found = figures(fit_node(recorded(board(scale, **changes), periods, seed=seed)))
        z += [(found[name].value - true[name]) / expanded(found[name]) for name in true]
        assert found["charge tau"].u < 0.005 * true["charge tau"]
        assert found["charge end"].u < 0.005 * 12
        assert found["upper"].u < 0.002 * 12
    # 24 figures at 95 %: more than 5 outside has a chance of 0.1 %
    assert sum(abs(x) > 1 for x in z) <= 5


@pytest.mark.parametrize(("bits", "noise_v"), [(8, 0.0), (8, 0.02), (12, 0.005)])
def test_codes_do_not_shift_the_figures(bits: int, noise_v: float) -> None:
    true = truth(FAST)
    trace = recorded(board(FAST), 40.3, bits=bits, noise_v=noise_v, seed=3)
    for name, found in figures(fit_node(trace)).items():
        assert abs(found.value - true[name]) < 1.5 * expanded(found), name


def test_a_series_resistance_is_found_from_the_jumps() -> None:
    """Truth by integration: the node jumps at both turns."""
    fit = fit_node(integrated(20, esr_ohm=15e3))
    assert fit.esr
    assert fit.esr.seen
    ohm = esr_ohm(fit, ohms(FALL_OHM, 330.0))
    assert ohm
    assert abs(ohm.value - 15e3) < expanded(ohm)
    assert ohm.u < 300
    assert fit.bow
    assert fit.memory
    assert not (fit.bow.seen)
    assert not (fit.memory.seen)
    assert fit.charge
    assert fit.charge.tau.value == pytest.approx((RISE_OHM + 15e3) * 47e-10, rel=3e-3)


def test_a_healthy_node_has_none_of_the_effects() -> None:
    seen = 0
    for seed in range(6):
        fit = fit_node(recorded(board(FAST), 25, seed=seed))
        assert fit.esr
        assert fit.bow
        assert fit.memory
        seen += fit.esr.seen + fit.bow.seen + fit.memory.seen
        assert abs(fit.esr.size.value) < 4 * fit.esr.size.u
    assert seen == 0  # false alarms are one in ten thousand


def test_the_overshoot_of_the_delay_is_taken_off_the_thresholds() -> None:
    """At 2 us a rise of 14 us runs on by 0.4 V."""
    delay_s = 2e-6
    circuit = board(1e-6, delay_upper=delay_s, delay_lower=delay_s)
    terms = Terms(
        delay_upper=seconds(delay_s, 0.02 * delay_s), delay_lower=seconds(delay_s, 0.02 * delay_s)
    )
    trace = recorded(circuit, 30, n=60_000)
    fit = fit_node(trace, terms=terms)
    states = settle_states(circuit)
    rise, fall = states.charge[0], states.discharge
    assert fall
    assert fit.turn_upper
    assert fit.turn_lower
    assert fit.upper
    assert fit.lower
    assert fit.overshoot_upper
    assert fit.overshoot_lower
    turn_v = float(rise.after(8.0, delay_s))
    assert fit.turn_upper.value == pytest.approx(turn_v, abs=expanded(fit.turn_upper))
    assert abs(fit.upper.value - 8) < expanded(fit.upper)
    assert abs(fit.lower.value - 4) < expanded(fit.lower)
    low_turn_v = float(fall.after(4.0, delay_s))
    assert fit.overshoot_lower.value == pytest.approx(4 - low_turn_v, rel=0.1)
    assert "assumed-no-delay" not in {notice.code for notice in fit.warnings}
    assert "assumed-no-delay" in {notice.code for notice in fit_node(trace).warnings}


def test_gain_and_timebase_enter_the_uncertainty_once_for_all() -> None:
    trace = recorded(board(FAST), 20)
    plain = fit_node(trace)
    rough = fit_node(trace, terms=Terms(u_gain_rel=0.01, u_offset_v=0.02, timebase_rel=0.01))
    assert plain.charge
    assert rough.charge
    assert rough.upper
    assert rough.charge.end.u == pytest.approx(math.hypot(0.12, 0.02), rel=0.02)
    assert rough.charge.tau.u / rough.charge.tau.value == pytest.approx(0.01 / 3**0.5, rel=0.02)
    assert {line.source for line in rough.upper.budget if line.common} == {"gain", "offset"}


def test_few_cycles_are_enough_and_said_to_be_few() -> None:
    true = truth(1.0)
    fit = fit_node(recorded(board(), 1.6, n=4_000))
    for name, found in figures(fit).items():
        assert abs(found.value - true[name]) < 1.5 * expanded(found), name
    assert fit.n_cycles == 1
    assert "node-few-cycles" in {notice.code for notice in fit.warnings}


def test_a_node_that_is_emptied_at_once_gives_its_rise_alone() -> None:
    """A one-shot: the fall is over before the next sample."""
    tau_s = 1e-3
    width_s, wait_s = tau_s * math.log(3), 0.4e-3
    t = np.arange(0, 24e-3, 1.5e-6) + 0.7e-3
    phase = t % (width_s + wait_s)
    ramp, fall = 12 - 12 * np.exp(-phase / tau_s), 8 * np.exp(-(phase - width_s) / 2e-6)
    rng = np.random.default_rng(1)
    trace = as_node(np.where(phase < width_s, ramp, fall) + rng.normal(0, 0.01, t.size), 1.5e-6)
    fit = fit_node(trace)
    assert fit.charge
    assert abs(fit.charge.end.value - 12) < 1.5 * expanded(fit.charge.end)
    assert abs(fit.charge.tau.value - tau_s) < 1.5 * expanded(fit.charge.tau)


@pytest.mark.parametrize(
    ("volts", "code"),
    [
        (np.full(2000, 6.0), "flat-trace"),
        (np.tile([0.0] * 5 + [6.0] * 5, 200), "node-too-short"),
    ],
)
def test_a_trace_without_slopes_is_refused(volts: np.ndarray, code: str) -> None:
    rng = np.random.default_rng(0)
    with pytest.raises(MeasurementError) as caught:
        fit_node(as_node(volts + rng.normal(0, 0.01, volts.size), 1e-3))
    assert caught.value.code == code
    assert caught.value.hint


def test_a_long_record_is_averaged_in_blocks() -> None:
    true = truth(FAST)
    trace = recorded(board(FAST), 12, n=1_000_000)
    fit = fit_node(trace)
    assert fit.charge
    for name, found in figures(fit).items():
        assert abs(found.value - true[name]) < 1.5 * expanded(found), name
    assert fit.charge.n_points > 300_000


def test_a_gap_in_the_record_is_no_slope() -> None:
    trace = recorded(board(FAST), 20)
    volts = np.concatenate(list(trace.samples.blocks()))
    assert isinstance(trace.time, UniformTime)
    dt_s = trace.time.dt_s
    gapped = Waveform(
        samples=ArraySamples(np.concatenate([volts[:9_000], volts[11_000:]])),
        time=trace.time,
        spans=(
            Span(start=0, stop=9_000, start_s=0.0),
            Span(start=9_000, stop=18_000, start_s=11_000 * dt_s),
        ),
        channel="NODE",
    )
    true = truth(FAST)
    for name, found in figures(fit_node(gapped)).items():
        assert abs(found.value - true[name]) < 1.5 * expanded(found), name


def test_figures_become_readings_of_the_diagnosis() -> None:
    fit = fit_node(recorded(board(FAST), 20))
    readings = {reading.kind: reading for reading in node_readings(fit)}
    assert set(readings) == {
        "node-upper",
        "node-lower",
        "node-charge-end",
        "node-discharge-end",
        "node-tau-charge",
        "node-tau-discharge",
    }
    assert fit.charge
    assert readings["node-tau-charge"].value == fit.charge.tau.value
    assert readings["node-tau-charge"].unit == "s"


def test_noise_that_remembers_is_covered() -> None:
    """Noise of 20 mV that remembers a tenth of a slope: all six figures, eight records."""
    true, inside, total = truth(FAST), 0, 0
    for seed in range(8):
        rng = np.random.default_rng(50 + seed)
        quiet = recorded(board(FAST), 14, n=2_800, seed=seed, noise_v=0.0)
        fit = fit_node(with_noise(quiet, remembering(rng, 2_800, 0.02, 10.0)))
        assert fit.inflation > 1.3
        for name, found in figures(fit).items():
            inside += abs(found.value - true[name]) <= expanded(found)
            total += 1
    assert inside >= 0.85 * total  # the figures of one record go together


def test_hum_of_the_mains_does_not_make_it_too_sure() -> None:
    """Hum of twice the noise, several periods a slope: coverage of all six figures."""
    true, inside, total = truth(FAST), 0, 0
    for seed in range(8):
        trace = recorded(board(FAST), 12, n=4_000, seed=seed)
        rng = np.random.default_rng(seed)
        phase = rng.uniform(0, 2 * math.pi)
        hum = 0.028 * np.sin(2 * math.pi * 7.37 * np.arange(4_000) * 12 / 4_000 + phase)
        fit = fit_node(with_noise(trace, hum))
        for name, found in figures(fit).items():
            inside += abs(found.value - true[name]) <= expanded(found)
            total += 1
    assert inside >= 0.9 * total
