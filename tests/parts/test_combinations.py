"""Combinations of preferred values, against a linear program that is asked about each apart."""

import itertools

import numpy as np
import pytest
from scipy import optimize

from benchtool.model.quantity import Contribution, Measured
from benchtool.parts.combinations import fit_combinations, ratio_of_resistors
from benchtool.parts.series import values
from benchtool.uncertainty import combine, expanded

ASTABLE = {"charge": ("RA", "RB"), "discharge": ("RB",)}


def product(value: float, u_rel: float = 0.006) -> Measured:
    return Measured(value=value, u=u_rel * value, unit="s")


def astable(RA: float, RB: float, C: float, u_rel: float = 0.006) -> tuple[Measured, Measured]:
    return product((RA + RB) * C, u_rel), product(RB * C, u_rel)


def is_feasible(
    RA: float, RB: float, C: float, products: tuple[Measured, Measured], r: float, c: float
) -> bool:
    """Ask a linear program: with x = C·c the products are linear in x·a·RA, x·b·RB and x."""
    (charge, discharge) = products
    charge_U, discharge_U = (expanded(item) for item in products)
    rows, ends = [], []

    def at_most(row: list[float], end: float) -> None:
        rows.append(row)
        ends.append(end)

    # unknowns: p = x·a·RA, q = x·b·RB, x
    at_most([1, 1, 0], charge.value + charge_U)
    at_most([-1, -1, 0], charge_U - charge.value)
    at_most([0, 1, 0], discharge.value + discharge_U)
    at_most([0, -1, 0], discharge_U - discharge.value)
    for column, ohm in ((0, RA), (1, RB)):
        upper, lower = [0.0, 0.0, -ohm * (1 + r)], [0.0, 0.0, ohm * (1 - r)]
        upper[column], lower[column] = 1.0, -1.0
        at_most(upper, 0.0)
        at_most(lower, 0.0)
    scale = np.array([1 / charge.value, 1 / charge.value, 1 / C])  # unknowns near 1
    matrix = np.array(rows) / scale
    sizes = np.abs(matrix).max(axis=1)
    found = optimize.linprog(
        [0, 0, 0],
        A_ub=matrix / sizes[:, None],
        b_ub=np.array(ends) / sizes,
        bounds=[(0, None), (0, None), (1 - c, 1 + c)],
    )
    return bool(found.status == 0)


@pytest.mark.parametrize(
    ("u_charge", "u_discharge", "r_rel", "c_rel"),
    [(0.006, 0.006, 0.05, 0.1), (1e-4, 0.05, 0.01, 0.1), (0.05, 1e-4, 0.01, 0.1)],
)
def test_the_count_is_that_of_a_linear_program_for_every_set(
    u_charge: float, u_discharge: float, r_rel: float, c_rel: float
) -> None:
    """Round the marked board: 7 x 10 resistors and 3 capacitors, each set asked apart."""
    C = 47e-6 * 0.93
    products = product(430e3 * C, u_charge), product(330e3 * C, u_discharge)
    found = fit_combinations(
        *products,
        **ASTABLE,
        resistor_tolerance_rel=r_rel,
        capacitor_tolerance_rel=c_rel,
        most=10_000,
    )
    near = {
        (item.parts["RA"], item.parts["RB"], item.parts["C"])
        for item in found.best
        if 100e3 <= item.parts["RA"] < 200e3
        and 200e3 <= item.parts["RB"] < 500e3
        and 33e-6 <= item.parts["C"] <= 68e-6
    }
    resistors = [float(f"{value}e5") for value in values("E24")]
    sets = itertools.product(
        [x for x in resistors if x < 200e3],
        [x for x in resistors if 200e3 <= x < 500e3],
        [33e-6, 47e-6, 68e-6],
    )
    asked = {item for item in sets if is_feasible(*item, products, r_rel, c_rel)}
    assert near == asked
    assert asked


def test_the_board_as_built_comes_first_among_hundreds() -> None:
    found = fit_combinations(*astable(100e3, 330e3, 47e-6 * 0.97), **ASTABLE)
    assert found.best[0].parts == {"RA": 100e3, "RB": 330e3, "C": 47e-6}
    assert found.n_fitting > 100
    assert len(found.best) == 10
    assert [item.cost for item in found.best] == sorted(item.cost for item in found.best)


def test_closer_tolerances_leave_fewer() -> None:
    products = astable(100e3, 330e3, 47e-6)
    wide = fit_combinations(*products, **ASTABLE)
    close = fit_combinations(
        *products, **ASTABLE, resistor_tolerance_rel=0.01, capacitor_tolerance_rel=0.05
    )
    assert close.n_fitting < wide.n_fitting / 3


def test_exact_parts_fit_what_was_made_of_them_and_their_like_in_other_decades_alone() -> None:
    """Nothing has a tolerance and U is 2 ppm: only sets of the very same products are left."""
    found = fit_combinations(
        *astable(100e3, 330e3, 47e-6, 1e-6),
        **ASTABLE,
        resistor_tolerance_rel=0.0,
        capacitor_tolerance_rel=0.0,
        most=1000,
    )
    assert found.n_fitting == len(found.best)
    for item in found.best:
        high, low, timing_f = (item.parts[ref] for ref in ("RA", "RB", "C"))
        assert (high + low) * timing_f == pytest.approx(430e3 * 47e-6, rel=3e-6)
        assert low * timing_f == pytest.approx(330e3 * 47e-6, rel=3e-6)
    decades = [item.parts for item in found.best if item.parts["RB"] / item.parts["RA"] == 3.3]
    assert {"RA": 10e3, "RB": 33e3, "C": 470e-6} in decades


def test_one_resistor_and_a_steering_diode_have_their_own_products() -> None:
    single = fit_combinations(
        product(68e3 * 47e-6), product(68e3 * 47e-6), charge=("R",), discharge=("R",)
    )
    assert {"R": 68e3, "C": 47e-6} in [item.parts for item in single.best]
    diode = fit_combinations(
        product(33e3 * 1e-6), product(120e3 * 1e-6), charge=("RA",), discharge=("RB",)
    )
    assert {"RA": 33e3, "RB": 120e3, "C": 1e-6} in [item.parts for item in diode.best]


def test_two_products_of_one_resistor_that_disagree_fit_nothing() -> None:
    found = fit_combinations(
        product(1.0, 1e-4), product(1.2, 1e-4), charge=("R",), discharge=("R",)
    )
    assert found.n_fitting == 0


def test_a_product_of_nothing_is_refused() -> None:
    with pytest.raises(ValueError, match="greater than 0"):
        fit_combinations(product(1.0), Measured(value=0.0, u=0.0, unit="s"), **ASTABLE)


def test_the_ratio_of_the_resistors_needs_no_part_and_loses_what_is_common() -> None:
    """A threshold that is off moves both products alike: RA/RB is as sure as if it were not."""

    def tau(value: float) -> Measured:
        terms = [
            Contribution(source="threshold", u=0.02 * value, common=True),
            Contribution(source="scatter", u=1e-4 * value),
        ]
        return combine(value, "s", terms)

    ratio = ratio_of_resistors(tau(430e3 * 47e-6), tau(330e3 * 47e-6))
    assert ratio.value == pytest.approx(100 / 330)
    assert ratio.u == pytest.approx(430 / 330 * 1e-4 * 2**0.5)
