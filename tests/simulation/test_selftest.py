"""The self-test finds a broken closed form and an uncertainty that is too small."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from benchtool.circuits import TOPOLOGIES, Circuit, predict
from benchtool.model.quantity import Bound, Measured
from benchtool.model.timing import Timing
from benchtool.selftest import check_closed_forms, closed_forms, coverage, run_selftest
from benchtool.selftest.integration import integrate_times
from benchtool.simulation import Acquisition, simulate


def test_every_topology_agrees_with_its_node_equation() -> None:
    checks = check_closed_forms()
    assert [check.name for check in checks] == [f"closed form: {name}" for name in TOPOLOGIES]
    assert all(check.ok and 0 < check.found < 1e-10 for check in checks)


def test_a_closed_form_that_is_off_by_a_hundredth_of_a_percent_is_found(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    def off(circuit: Circuit) -> object:
        right = predict(circuit)
        return replace(right, t_low=None if right.t_low is None else right.t_low * 1.0001)

    monkeypatch.setattr(closed_forms, "predict", off)
    failed = [check.name for check in check_closed_forms() if not check.ok]
    assert failed == [
        "closed form: astable",
        "closed form: astable-diode",
        "closed form: output-fed",
        "closed form: schmitt",
    ]


def test_an_uncertainty_of_a_third_is_found(monkeypatch: pytest.MonkeyPatch) -> None:
    honest = coverage.expanded
    monkeypatch.setattr(coverage, "expanded", lambda measured: honest(measured) / 3)
    checks = coverage.check_coverage(80)
    assert any(not check.ok for check in checks)


def test_a_small_self_test_holds() -> None:
    checks = run_selftest(n_captures=40)
    assert all(check.ok for check in checks)
    shares = [check for check in checks if check.name.startswith("coverage")]
    assert len(shares) == 4
    assert all("of 10 simulated captures" in check.text for check in shares)


def test_only_a_value_within_u_of_the_truth_is_covered(spacing: Circuit) -> None:
    acquisition = Acquisition(rate_hz=10.0, periods=3)
    _, truth = simulate(spacing, acquisition, np.random.default_rng(0))
    assert truth.period is not None
    near, far = (
        Measured(value=truth.period + off_s, u=1e-3, unit="s") for off_s in (1.9e-3, 2.0e-3)
    )
    cases = (near, far, Bound(unit="s", at_least=1.0), None)
    covered = [coverage._covers(Timing(period=case), truth, "period") for case in cases]
    # k is 1.960 for unlimited degrees of freedom
    assert covered == [True, False, False, False]


def test_the_integrator_says_when_a_threshold_is_never_reached(spacing: Circuit) -> None:
    with pytest.raises(ArithmeticError, match="never reaches"):
        integrate_times(replace(spacing, shunt_ohm=500e3))


def test_the_integrator_gives_the_textbook_times_of_an_ideal_circuit(spacing: Circuit) -> None:
    ideal = replace(spacing, r_on=0.0, i_leak=0.0, delay_upper=0.0, delay_lower=0.0)
    times = integrate_times(ideal)
    ln2, ln3 = 0.6931471805599453, 1.0986122886681098
    assert times["t_high"] == pytest.approx(430e3 * 47e-6 * ln2, rel=1e-10)
    assert times["t_low"] == pytest.approx(330e3 * 47e-6 * ln2, rel=1e-10)
    assert times["first_high"] == pytest.approx(430e3 * 47e-6 * ln3, rel=1e-10)
