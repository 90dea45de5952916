"""Number lines in plain characters."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchtool.report.numberline import LEGEND, NumberLine, draw_line

WIDTH = 61


def line(value: float | None, **given: float | None) -> str:
    return draw_line(NumberLine(value=value, **given), WIDTH)  # type: ignore[arg-type]


def test_limits_stand_a_sixth_from_the_ends() -> None:
    drawn = line(None, lower=10.0, upper=20.0)
    # 25 % of the distance is shown beyond each limit: 2.5 of 15, a sixth
    assert [i for i, char in enumerate(drawn) if char == "|"] == [10, 50]
    assert set(drawn[11:50]) == {"-"}
    assert drawn[:10].strip() == ""


def test_the_value_and_its_U_stand_to_scale() -> None:
    drawn = line(15.0, U=2.5, lower=10.0, upper=20.0)
    assert drawn.index("o") == 30
    assert (drawn.index("("), drawn.index(")")) == (20, 40)


def test_a_small_U_is_not_drawn_wider_than_it_is() -> None:
    drawn = line(15.0, U=0.01, lower=10.0, upper=20.0)
    assert "(" not in drawn
    assert "o" in drawn


def test_the_guard_band_draws_the_limits_in() -> None:
    drawn = line(15.0, lower=10.0, upper=20.0, accept_lower=12.5, accept_upper=17.5)
    assert (drawn.index("["), drawn.index("]")) == (20, 40)
    assert set(drawn[21:30]) == {"="}
    assert set(drawn[11:20]) == {"-"}


def test_no_accept_zone_draws_none() -> None:
    drawn = line(15.0, U=20.0, lower=10.0, upper=20.0)
    assert not set("[]=") & set(drawn)


@pytest.mark.parametrize(("value", "sign", "at"), [(3.0, "<", 0), (99.0, ">", -1)])
def test_a_value_off_the_line_is_an_arrow_at_its_end(value: float, sign: str, at: int) -> None:
    drawn = line(value, U=0.1, lower=10.0, upper=20.0)
    assert drawn[at] == sign
    assert "o" not in drawn


def test_a_value_just_outside_is_still_shown() -> None:
    drawn = line(9.0, lower=10.0, upper=20.0)
    assert drawn.index("o") < drawn.index("|")


def test_one_limit_is_enough() -> None:
    upper = line(4.0, upper=5.0)
    assert upper.count("|") == 1
    assert upper.index("o") < upper.index("|")
    lower = line(6.0, lower=5.0)
    assert lower.index("|") < lower.index("o")


def test_equal_limits_and_limits_at_zero_are_drawn() -> None:
    assert line(None, lower=5.0, upper=5.0).count("|") == 1
    assert line(None, lower=0.0, upper=0.0).count("|") == 1
    assert line(5.0, lower=5.0, upper=5.0).count("o") == 1


def test_the_legend_names_every_sign() -> None:
    assert all(sign in LEGEND for sign in "|[]o()<>")


NUMBERS = st.floats(min_value=-1e12, max_value=1e12, allow_subnormal=False)
MAYBE = st.none() | NUMBERS


@given(value=MAYBE, U=st.floats(min_value=0, max_value=math.inf), low=NUMBERS, span=NUMBERS)
def test_any_line_fills_its_width_and_shows_the_value_once(
    value: float | None, U: float, low: float, span: float
) -> None:
    shown = draw_line(NumberLine(value=value, U=U, lower=low, upper=low + abs(span)), WIDTH)
    assert len(shown) == WIDTH
    assert sum(shown.count(sign) for sign in "o<>") == (0 if value is None else 1)
    assert set(shown) <= set(" -|o()<>")
