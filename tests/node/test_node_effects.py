from __future__ import annotations

import pytest
from node_boards import FAST, RB, C, integrated

from benchtool.node import fit_node
from benchtool.uncertainty import expanded

FALL_S = RB * C * FAST


@pytest.mark.parametrize("bow_per_v", [-0.02, 0.01])
def test_a_voltage_coefficient_is_found_with_its_size(bow_per_v: float) -> None:
    """A class 2 ceramic loses a few percent a volt; truth by integration of C(v)."""
    fit = fit_node(integrated(20, bow_per_v=bow_per_v))
    assert fit.bow
    assert fit.memory
    assert fit.bow.seen
    assert not fit.memory.seen
    assert abs(fit.bow.size.value - bow_per_v) < expanded(fit.bow.size)
    assert fit.bow.size.u < 0.002
    assert fit.charge
    assert fit.discharge
    assert abs(fit.charge.end.value - 12) < expanded(fit.charge.end)
    assert abs(fit.discharge.end.value) < expanded(fit.discharge.end)


@pytest.mark.parametrize("turns", [0.05, 0.15])
def test_dielectric_absorption_is_found_and_told_from_a_bow(turns: float) -> None:
    """A branch R-C of 5 % across the capacitor, its time constant a share of the slope's."""
    fit = fit_node(integrated(20, branch_share=0.05, branch_s=turns * FALL_S))
    assert fit.bow
    assert fit.memory
    assert fit.memory.seen
    assert not fit.bow.seen
    assert fit.memory.size.value > 0
    assert fit.memory_s == pytest.approx(turns * FALL_S, rel=0.2)
    assert fit.charge
    assert fit.discharge
    assert abs(fit.charge.end.value - 12) < expanded(fit.charge.end)
    # Quick against the slope, the branch adds to the capacitance.
    assert fit.discharge.tau.value == pytest.approx(1.05 * FALL_S, rel=0.02)


def test_without_its_memory_the_asymptotes_would_be_wrong() -> None:
    """What the model of the memory is for: the plain exponentials miss by tens of their u."""
    fit = fit_node(integrated(20, branch_share=0.05, branch_s=0.15 * FALL_S))
    plain = fit_node(integrated(20))
    assert fit.charge
    assert plain.charge
    assert fit.charge.end.u > 3 * plain.charge.end.u  # the price of it


def test_all_at_once_are_told_apart() -> None:
    fit = fit_node(
        integrated(20, bow_per_v=-0.02, branch_share=0.05, branch_s=0.15 * FALL_S, esr_ohm=5e3)
    )
    assert fit.esr
    assert fit.bow
    assert fit.memory
    assert fit.esr.seen
    assert fit.bow.seen
    assert fit.memory.seen
    assert fit.bow.size.value == pytest.approx(-0.02, abs=0.004)
    assert fit.esr.size.value == pytest.approx(5e3 / RB, rel=0.1)
