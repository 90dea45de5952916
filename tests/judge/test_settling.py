"""How many more periods would settle a check, against the formula worked out anew."""

import math

import pytest
from scipy import stats

from benchtool.judge.settling import MOST_PERIODS, dominant_source, periods_to_settle
from benchtool.model.design import Rule
from benchtool.model.quantity import Contribution, Measured
from benchtool.uncertainty import combine


def _measured(scatter: float, timebase: float, *, n: int, dof: float) -> Measured:
    budget = [
        Contribution(source="scatter", u=scatter, dof=dof),
        Contribution(source="timebase", u=timebase, common=True),
    ]
    return combine(15.97, "s", budget, n=n)


def _w(scatter: float, timebase: float, n: int, more: int, dof: float) -> float:
    """Return t·u after ``more`` periods: scatter falls with the root of n, the timebase stays."""
    repeated = scatter * math.sqrt(n / (n + more))
    u = math.hypot(repeated, timebase)
    effective = math.floor(u**4 / (repeated**4 / dof))
    return float(stats.t.ppf(0.975, effective) * u)


@pytest.mark.parametrize(
    ("scatter", "timebase", "margin"), [(0.03, 0.001, 0.03), (0.02, 0.005, 0.015)]
)
def test_the_number_is_the_least_that_settles(
    scatter: float, timebase: float, margin: float
) -> None:
    n, dof = 100, 11
    more = periods_to_settle(_measured(scatter, timebase, n=n, dof=dof), margin, Rule())
    assert more is not None
    assert _w(scatter, timebase, n, more, dof) <= margin
    assert _w(scatter, timebase, n, more - 1, dof) > margin


def test_few_periods_gain_degrees_of_freedom_too() -> None:
    """From 2 periods, t falls from 12.7 to 2.2 at 12 and stays: scatter then is of 12 batches."""

    def w(n: int) -> float:
        t = stats.t.ppf(0.975, min(n - 1, 11))
        return float(t * 0.01 * math.sqrt(2 / n))

    for margin in (0.02, 0.01, 0.002):
        least = next(n for n in range(3, 10_000) if w(n) <= margin)
        assert periods_to_settle(_measured(0.01, 0.0, n=2, dof=1), margin, Rule()) == least - 2


def test_the_spread_of_the_ic_stays_while_scatter_falls() -> None:
    budget = [
        Contribution(source="scatter", u=0.2, dof=11),
        Contribution(source="upper threshold", u=0.1),
    ]
    product = combine(20.0, "s", budget, n=50)
    assert periods_to_settle(product, 0.19, Rule()) is None
    assert periods_to_settle(product, 0.25, Rule()) is not None


@pytest.mark.parametrize("margin", [0.03, -0.03])
def test_the_margin_counts_on_either_side_of_the_limit(margin: float) -> None:
    case = _measured(0.03, 0.001, n=100, dof=11)
    assert periods_to_settle(case, margin, Rule()) == periods_to_settle(case, 0.03, Rule())


def test_a_timebase_wider_than_the_margin_is_settled_by_no_repetition() -> None:
    assert periods_to_settle(_measured(0.001, 0.03, n=100, dof=11), 0.03, Rule()) is None


def test_a_value_on_the_limit_is_settled_by_nothing() -> None:
    assert periods_to_settle(_measured(0.03, 0.0, n=100, dof=11), 0.0, Rule()) is None


def test_more_than_a_million_periods_is_no_advice() -> None:
    margin = 0.03 * 1.96 * math.sqrt(100 / (3 * MOST_PERIODS))
    assert periods_to_settle(_measured(0.03, 0.0, n=100, dof=11), margin, Rule()) is None


def test_one_interval_is_settled_by_more_of_them() -> None:
    """The jitter assumed for a single interval is a stated figure and falls all the same."""
    budget = [
        Contribution(source="assumed jitter", u=0.008),
        Contribution(source="grid", u=0.001),
        Contribution(source="timebase", u=0.0004, common=True),
    ]
    single = combine(14.0, "s", budget)
    more = periods_to_settle(single, 0.008, Rule())
    assert more == math.ceil((0.008**2 + 0.001**2) / ((0.008 / 1.959964) ** 2 - 0.0004**2)) - 1


def test_the_spread_of_the_ic_is_not_reduced_by_periods() -> None:
    product = combine(20.0, "s", [Contribution(source="upper threshold", u=0.2)], n=50)
    assert periods_to_settle(product, 0.1, Rule()) is None
    assert dominant_source(product) == "upper threshold"


def test_a_value_without_a_budget_names_no_source() -> None:
    assert dominant_source(Measured(value=1.0, u=0.1, unit="s")) is None
    assert periods_to_settle(Measured(value=1.0, u=0.1, unit="s"), 0.1, Rule()) is None
