"""Preferred values against the tables of IEC 60063."""

import csv
import math
from collections import defaultdict
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchtool.parts import SERIES, is_preferred, nearest, neighbours, series_of, values

TABLE = Path(__file__).parents[1] / "reference" / "iec60063_e_series.csv"


def published() -> dict[str, tuple[float, ...]]:
    rows = csv.DictReader(
        line for line in TABLE.read_text("utf-8").splitlines() if not line.startswith("#")
    )
    table: dict[str, list[float]] = defaultdict(list)
    for row in rows:
        table[row["series"]].append(float(row["value"]))
    return {series: tuple(of_series) for series, of_series in table.items()}


def test_every_series_is_the_published_table() -> None:
    assert {series: values(series) for series in SERIES} == published()


def test_e24_keeps_the_values_that_the_formula_would_not_give() -> None:
    """2.7, 3.0, 3.3, 3.6, 3.9, 4.3, 4.7 and 8.2 are customary and not the rounded powers."""
    formula = {round(10 ** (i / 24), 1) for i in range(24)}
    assert set(values("E24")) - formula == {2.7, 3.0, 3.3, 3.6, 3.9, 4.3, 4.7, 8.2}


def test_nearest_is_by_ratio_and_not_by_difference() -> None:
    """Between 10 and 22 the geometric middle is 14.83, the arithmetic one 16."""
    assert nearest(14.8, "E3") == 10.0
    assert nearest(15.0, "E3") == 22.0


@pytest.mark.parametrize("value", [1e-12, 1e3, 1.0, 9.99e5, 1e6])
def test_neighbours_cross_decades(value: float) -> None:
    below, above = neighbours(value * 0.99, "E6")
    assert below < value * 0.99 < above
    assert above / below == pytest.approx(10 ** (1 / 6), rel=0.06)  # E6 steps are 1.43 to 1.52


def test_a_value_that_arithmetic_left_a_little_off_is_still_preferred() -> None:
    assert is_preferred(3 * 0.1 * 1.1 * 1e6)  # 330000.00000000006
    assert is_preferred(4.7e-9)
    assert not is_preferred(4.71e-9)


def test_both_e24_and_e96_values_count_as_preferred() -> None:
    assert series_of(120.0) == "E12"
    assert series_of(121.0) == "E48"
    assert not is_preferred(120.0, "E96")
    assert series_of(3.4) == "E96"
    assert series_of(4.6) is None


@pytest.mark.parametrize("value", [0.0, -1.0, math.nan, math.inf])
def test_what_is_no_value_of_a_part_is_refused(value: float) -> None:
    assert not is_preferred(value)
    with pytest.raises(ValueError, match="above zero"):
        nearest(value, "E24")


def test_an_unknown_series_is_refused_by_name() -> None:
    with pytest.raises(ValueError, match="E13"):
        values("E13")


@given(value=st.floats(1e-13, 1e9), series=st.sampled_from(SERIES))
def test_nearest_is_the_nearer_neighbour_and_no_series_value_lies_between(
    value: float, series: str
) -> None:
    below, above = neighbours(value, series)
    assert below <= value * (1 + 1e-9)
    assert above >= value * (1 - 1e-9)
    assert nearest(value, series) == min((below, above), key=lambda x: abs(math.log(x / value)))
    everything = (v * 10.0**decade for decade in range(-15, 11) for v in values(series))
    assert not [v for v in everything if below * (1 + 1e-9) < v < above * (1 - 1e-9)]
