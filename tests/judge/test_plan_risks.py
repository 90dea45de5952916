"""Risks of a guard band, against JCGM 106, numerical double integration and brute force."""

import math
import tomllib
from pathlib import Path

import numpy as np
import pytest
from scipy import integrate, stats

from benchtool.judge.plan_risks import judge_boards, judge_lot
from benchtool.model.plan import PlannedQuantity
from benchtool.model.quantity import Measured

EXAMPLES = Path(__file__).parents[1] / "reference" / "conformity_examples.toml"
RESISTORS = tomllib.loads(EXAMPLES.read_text("utf-8"))["resistor_lot"]
N = 400_000


def normal_lot(mean: float, sd: float) -> np.ndarray:
    """Return boards at the middles of N equally likely slices of a normal law."""
    return stats.norm.ppf((np.arange(N) + 0.5) / N, mean, sd)


def test_the_resistor_lot_of_jcgm_106_has_its_published_risks() -> None:
    """JCGM 106:2012, 9.5: figures and clause from memory, as the reference file says."""
    lot = RESISTORS
    found = judge_lot(
        normal_lot(lot["process_mean"], lot["process_sd"]),
        lot["u"],
        lot["w"],
        lot["lower"],
        lot["upper"],
    )
    assert round(found.consumer, 2) == lot["published_consumer_risk"]
    assert round(found.producer, 2) == lot["published_producer_risk"]
    # 2e-5: 400,000 slices place the limit to 1/400,000, the table of the normal law adds 1e-7
    assert found.consumer == pytest.approx(lot["exact_consumer_risk"], abs=2e-5)
    assert found.producer == pytest.approx(lot["exact_producer_risk"], abs=2e-5)
    assert found.conforming == pytest.approx(lot["exact_conforming"], abs=2e-5)
    assert found.bad_accepted == pytest.approx(found.consumer / (1 - found.conforming))
    assert found.good_not_accepted == pytest.approx(found.producer / found.conforming)


@pytest.mark.parametrize(("u", "w"), [(0.3, 0.6), (0.5, 0.0), (0.1, 0.25)])
def test_the_risks_are_those_of_a_double_integral(u: float, w: float) -> None:
    """Over the true value and the measured one, limits 8 and 12, boards normal(10.4, 1)."""
    lower, upper = 8.0, 12.0

    def over(x0: float, x1: float) -> float:
        x, y = np.linspace(x0, x1, 1501), np.linspace(lower + w, upper - w, 1501)
        density = stats.norm.pdf(x, 10.4, 1.0)[:, None] * stats.norm.pdf(y, x[:, None], u)
        return float(integrate.simpson(integrate.simpson(density, x=y), x=x))

    found = judge_lot(normal_lot(10.4, 1.0), u, w, lower, upper)
    good_accepted = over(lower, upper)
    bad_accepted = over(4.0, lower) + over(upper, 16.0)
    assert found.consumer == pytest.approx(bad_accepted, abs=2e-5)
    assert found.passing == pytest.approx(good_accepted + bad_accepted, abs=2e-5)
    assert found.producer == pytest.approx(found.conforming - good_accepted, abs=2e-5)


def test_the_shares_of_the_three_verdicts_are_those_of_brute_force() -> None:
    rng = np.random.default_rng(3)
    true, u, w = rng.normal(0.0, 1.0, N), 0.4, 0.8
    seen = true + u * rng.standard_normal(N)
    found = judge_lot(true, u, w, -2.0, None)
    # 0.004: five standard errors of a share from 400,000 boards
    assert found.passing == pytest.approx(np.mean(seen >= -2 + w), abs=0.004)
    assert found.failing == pytest.approx(np.mean(seen < -2 - w), abs=0.004)
    assert found.passing + found.undecided + found.failing == pytest.approx(1.0)


def test_a_board_that_stands_still_fails_whatever_the_limit() -> None:
    found = judge_lot(np.array([1.0, math.nan]), 1e-6, 2e-6, None, 2.0)
    assert found.failing == pytest.approx(0.5)
    assert found.passing == pytest.approx(0.5)
    assert found.conforming == 0.5


def test_an_exact_value_is_decided_by_where_it_lies() -> None:
    found = judge_lot(np.array([0.5, 1.5, 2.5]), 0.0, 0.0, 1.0, 2.0)
    assert (found.passing, found.failing, found.undecided) == pytest.approx((1 / 3, 2 / 3, 0.0))


def planned(quantity: str, lower: float, upper: float, u: float | None) -> PlannedQuantity:
    expected = None if u is None else Measured(value=10.0, u=u, unit="s")
    return PlannedQuantity(
        quantity=quantity,
        nominal=10.0,
        unit="s",
        lower=lower,
        upper=upper,
        n=0 if u is None else 1,
        expected=expected,
        U=None,
        w=None if u is None else 2 * u,
        room=None,
        risks=None,
    )


def test_a_board_gets_its_worst_verdict() -> None:
    """Two independent quantities, each inside with the same chance: both with its square."""
    rng = np.random.default_rng(11)
    rows = {name: rng.normal(10.0, 1.0, N) for name in ("t_high", "t_low")}
    limits = [planned(name, 8.5, 11.5, 0.1) for name in rows]
    alone = judge_lot(rows["t_high"], 0.1, 0.2, 8.5, 11.5)
    both = judge_boards(rows, limits)
    # 0.004: five standard errors of a share from 400,000 boards, twice over
    assert both.passing == pytest.approx(alone.passing**2, abs=0.006)
    assert 1 - both.failing == pytest.approx((1 - alone.failing) ** 2, abs=0.006)


def test_a_quantity_without_an_interval_leaves_every_board_undecided() -> None:
    rows = {"t_high": np.full(100, 10.0)}
    found = judge_boards(rows, [planned("t_high", 8.5, 11.5, None)])
    assert (found.passing, found.undecided) == (0.0, 1.0)


def test_nothing_judged_gives_no_share() -> None:
    assert judge_boards({}, []) is None
