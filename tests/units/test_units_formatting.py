"""Figures as people read them: prefixes, rounding to U, and the way back."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchtool.units import format_measured, format_value, parse

UNIT_NAMES = ["ohm", "F", "s", "V", "A", "Hz", "1", "1/K", "1/s", "degC"]
SIZES = st.floats(min_value=1e-18, max_value=1e15) | st.floats(min_value=-1e15, max_value=-1e-18)


@pytest.mark.parametrize(
    ("value", "unit", "shown"),
    [
        (4700, "ohm", "4.7 kΩ"),
        (999_960, "ohm", "1 MΩ"),
        (47e-6, "F", "47 µF"),
        (2200e-6, "F", "2200 µF"),
        (22.18, "s", "22.18 s"),
        (22_184.2, "s", "22180 s"),
        (9.9999e-7, "s", "1 µs"),
        (0.0403, "Hz", "40.3 mHz"),
        (0.004, "1", "0.4 %"),
        (1.58496, "1", "158.5 %"),
        (12.5, "1", "12.5"),
        (5e-5, "1", "50 ppm"),
        (2e-9, "1", "2 ppb"),
        (1e-5, "1/K", "10 ppm/K"),
        (25, "degC", "25 °C"),
        (0.0, "s", "0 s"),
        (-0.0, "s", "0 s"),
        (0.0, "1", "0 %"),
        (-12, "V", "-12 V"),
        (1e-20, "s", "1e-20 s"),
        (5e15, "Hz", "5000 THz"),
        (1e25, "ohm", "1e25 Ω"),
        (math.nan, "s", "no value"),
        (-math.inf, "V", "-∞ V"),
    ],
)
def test_shows_values_with_engineering_prefixes(value: float, unit: str, shown: str) -> None:
    assert format_value(value, unit) == shown


@pytest.mark.parametrize(
    ("value", "U", "unit", "shown"),
    [
        (14.0102, 0.0031, "s", "14.0102 s ± 0.0031 s"),
        (0.00102041, 3.14e-6, "s", "1.0204 ms ± 0.0031 ms"),
        (0.5631, 0.0031, "1", "56.31 % ± 0.31 %"),
        (47e-6, 9.96e-7, "F", "47.0 µF ± 1.0 µF"),
        (0.001, 0.02, "s", "1 ms ± 20 ms"),  # U above the value
        (0.523, 0.123, "s", "520 ms ± 120 ms"),  # U asks for tens
        (123_456, 2300, "s", "123500 s ± 2300 s"),
        (-1e-9, 0.02, "s", "0 ms ± 20 ms"),  # no negative zero
        (999.6, 10.4, "ohm", "1.000 kΩ ± 0.010 kΩ"),  # rounding crosses a prefix
        (0, 1e-5, "V", "0 µV ± 10 µV"),
        (1, 0, "s", "1 s ± 0 s"),
        (0, 0, "V", "0 V ± 0 V"),
        (1e20, 1e-20, "s", "1e20 s ± 1e-20 s"),
        (1e-20, 1e-21, "s", "1.00e-20 s ± 0.10e-20 s"),
        (1, math.nan, "s", "1 s (uncertainty not known)"),
    ],
)
def test_rounds_to_two_digits_of_u(value: float, U: float, unit: str, shown: str) -> None:
    assert format_measured(value, U, unit) == shown


def test_a_negative_uncertainty_is_refused() -> None:
    with pytest.raises(ValueError, match="zero or more"):
        format_measured(1.0, -0.1, "s")


@given(value=SIZES, unit=st.sampled_from(UNIT_NAMES), digits=st.integers(1, 15))
def test_what_is_shown_reads_back_within_half_a_digit(value: float, unit: str, digits: int) -> None:
    """Half a unit of the last digit shown is at most 0.5 * 10**(1 - digits) of the value."""
    back = parse(format_value(value, unit, digits), unit)
    assert back == pytest.approx(value, rel=0.5000001 * 10 ** (1 - digits), abs=0)


@given(value=SIZES, U=st.floats(1e-18, 1e15), unit=st.sampled_from(UNIT_NAMES))
def test_value_and_uncertainty_read_back_in_one_unit(value: float, U: float, unit: str) -> None:
    """U keeps two digits (5 % of itself at most), the value is off by half its last digit."""
    shown, shown_u = format_measured(value, U, unit).split(" ± ")
    assert parse(shown_u, unit) == pytest.approx(U, rel=0.05000001)
    fifteenth_digit = 5e-15 * abs(value)  # half of the last digit a float holds
    assert abs(parse(shown, unit) - value) <= 0.05000001 * U + fifteenth_digit


@given(value=SIZES, U=st.floats(1e-3, 1e3), unit=st.sampled_from(UNIT_NAMES))
def test_value_and_uncertainty_share_prefix_and_decimals(value: float, U: float, unit: str) -> None:
    shown, shown_u = (
        part.partition(" ") for part in format_measured(value, U * abs(value), unit).split(" ± ")
    )
    assert shown[2] == shown_u[2]
    decimals = [len(number.partition(".")[2]) for number, _, _ in (shown, shown_u)]
    assert decimals[0] == decimals[1]
