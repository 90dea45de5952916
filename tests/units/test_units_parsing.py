"""What people write, read into SI units, and what is refused."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchtool.errors import UnitError, UsageError
from benchtool.units import parse, parse_tolerance

READ = [
    ("4k7", "ohm", 4700.0),
    ("4K7", "ohm", 4700.0),
    ("R47", "ohm", 0.47),
    ("0R47", "ohm", 0.47),
    ("4R7", "ohm", 4.7),
    ("4Ω7", "ohm", 4.7),
    ("47R", "ohm", 47.0),
    ("1M", "ohm", 1e6),
    ("1Meg", "ohm", 1e6),
    ("1m", "ohm", 1e-3),
    ("330 kohm", "ohm", 330e3),
    ("330k\N{OHM SIGN}", "ohm", 330e3),
    ("330 k\N{GREEK CAPITAL LETTER OMEGA}", "ohm", 330e3),
    ("330kR", "ohm", 330e3),
    ("1 000 000", "ohm", 1e6),
    ("1\N{THIN SPACE}000", "ohm", 1e3),
    ("100n", "F", 1e-7),
    ("2u2", "F", 2.2e-6),
    ("0.1uF", "F", 1e-7),
    ("47uf", "F", 47e-6),
    ("47 \N{MICRO SIGN}F", "F", 47e-6),
    ("47\N{NO-BREAK SPACE}\N{GREEK SMALL LETTER MU}F", "F", 47e-6),
    ("p33", "F", 0.33e-12),
    ("2m2", "F", 2.2e-3),
    ("1F0", "F", 1.0),
    ("14.01s", "s", 14.01),
    ("2.5 ms", "s", 2.5e-3),
    (".5", "s", 0.5),
    ("2 min", "s", 120.0),
    ("1e-3", "s", 1e-3),
    ("1.5E3 us", "s", 1.5e-3),
    ("12V", "V", 12.0),
    ("3V3", "V", 3.3),
    ("-37 mV", "V", -0.037),
    ("\N{MINUS SIGN}37mV", "V", -0.037),
    ("+20n", "A", 20e-9),
    ("0.1 µA", "A", 1e-7),
    ("40.4 mHz", "Hz", 0.0404),
    ("1 MHz", "Hz", 1e6),
    ("5%", "1", 0.05),
    ("50 ppm", "1", 50e-6),
    ("50 ppb", "1", 50e-9),
    ("0.05", "1", 0.05),
    ("100 ppm/K", "1/K", 1e-4),
    ("100ppm/°C", "1/K", 1e-4),
    ("0.01 %/K", "1/K", 1e-4),
    ("2 ppm/s", "1/s", 2e-6),
    ("25 degC", "degC", 25.0),
    ("-10 °C", "degC", -10.0),
    ("25\N{DEGREE CELSIUS}", "degC", 25.0),
]


@pytest.mark.parametrize(("text", "unit", "value"), READ)
def test_reads_to_the_nearest_float(text: str, unit: str, value: float) -> None:
    """The decimal mark is moved in the text, so there is no rounding on the way."""
    assert parse(text, unit) == value


@pytest.mark.parametrize(
    ("text", "unit"),
    [
        ("", "ohm"),
        (" ", "s"),
        ("k", "ohm"),
        ("4k7k", "ohm"),
        ("4.7k7", "ohm"),
        ("10 00", "ohm"),
        ("1_000", "ohm"),
        ("0x10", "s"),
        ("5m", "1"),
        ("100 ppm", "1/K"),
        ("25 K", "degC"),
        ("nan", "s"),
        ("inf", "s"),
        ("1e400", "s"),
        ("4.7 kΩ ± 5 %", "ohm"),
        ("--5", "V"),
    ],
)
def test_refuses_what_is_no_value(text: str, unit: str) -> None:
    with pytest.raises(UnitError) as refused:
        parse(text, unit)
    assert repr(text) in refused.value.message
    assert refused.value.hint


def test_a_comma_is_never_guessed() -> None:
    with pytest.raises(UnitError, match="comma") as refused:
        parse("1,234", "ohm")
    assert refused.value.hint == "write 1.234 or 1234"


def test_the_message_names_the_unit_expected_and_the_one_given() -> None:
    with pytest.raises(UnitError) as refused:
        parse("47 ohm", "F")
    assert refused.value.message == (
        "'47 ohm' is not a capacitance in farads; it reads as a resistance in ohms"
    )
    assert refused.value.hint == "write it like 47u, 100n or 2u2"


def test_milli_and_mega_are_told_apart_by_case_alone() -> None:
    assert parse("1M", "Hz") == 1e9 * parse("1m", "Hz")


@pytest.mark.parametrize("number", [3, 3.0, np.float64(3), np.int32(3)])
def test_numbers_pass_through(number: float) -> None:
    value = parse(number, "s")
    assert value == 3.0
    assert type(value) is float


@pytest.mark.parametrize("number", [math.nan, math.inf, -math.inf, True, None])
def test_refuses_numbers_that_are_no_value(number: float) -> None:
    with pytest.raises(UnitError):
        parse(number, "s")


def test_a_unit_error_is_a_usage_error_and_a_value_error() -> None:
    assert issubclass(UnitError, UsageError)
    assert issubclass(UnitError, ValueError)


@pytest.mark.parametrize(
    ("text", "sides"),
    [
        ("5%", (-0.05, 0.05)),
        ("±5 %", (-0.05, 0.05)),
        ("+/-5%", (-0.05, 0.05)),
        ("1000 ppm", (-0.001, 0.001)),
        ("0.05", (-0.05, 0.05)),
        ("1e-3", (-0.001, 0.001)),
        (0.2, (-0.2, 0.2)),
        (0, (0.0, 0.0)),
        ("-20% 50%", (-0.2, 0.5)),
        ("-20%+50%", (-0.2, 0.5)),
        ("-20/+50 %", (-0.2, 0.5)),
        ("-20% .. 80%", (-0.2, 0.8)),
        ("-10 % to 100 %", (-0.1, 1.0)),
        ("0% 50%", (0.0, 0.5)),
        ("-1e-2 2e-2", (-0.01, 0.02)),
    ],
)
def test_reads_tolerances(text: str | float, sides: tuple[float, float]) -> None:
    assert parse_tolerance(text) == sides


@pytest.mark.parametrize(
    "text",
    [
        "5",
        5,
        "-0.5 5",
        "20% 50%",
        "-5%",
        -0.05,
        "+50% -20%",
        "100%",
        "-120% 5%",
        "",
        "five",
        "5%,3%",
    ],
)
def test_refuses_tolerances_that_do_not_enclose_the_value(text: str | float) -> None:
    with pytest.raises(UnitError) as refused:
        parse_tolerance(text)
    assert refused.value.hint


@given(st.text(alphabet="0123456789.,+-eEkKMmuµnpRΩFsVA%/ ", max_size=8))
def test_any_text_gives_a_finite_value_or_a_unit_error(text: str) -> None:
    for unit in ("ohm", "F", "s", "1"):
        try:
            value = parse(text, unit)
        except UnitError:
            continue
        assert math.isfinite(value)
