"""Markings against the codes of IEC 60062 and EIA-198, and every reading of ambiguous ones."""

import tomllib
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchtool.errors import UnitError
from benchtool.model.marking import Marking
from benchtool.parts import decode, split_markings, values
from benchtool.parts.bands import colour
from benchtool.parts.dielectrics import temperature_class
from benchtool.parts.tolerances import capacitor_tolerance, resistor_tolerance, voltage_code

CODES = tomllib.loads(
    (Path(__file__).parents[1] / "reference" / "iec60062_part_codes.toml").read_text("utf-8")
)
COLOURS = {exponent: name for name, exponent in CODES["colour_digit"].items()}


def first(text: str, kind: str) -> Marking:
    return next(item for item in decode(text) if item.kind == kind)


def found(text: str) -> list[tuple[str, float | None]]:
    return [(item.kind, item.value) for item in decode(text)]


@pytest.mark.parametrize(("code", "value_ohm"), CODES["resistor_letter"].items())
def test_letters_replace_the_decimal_mark_of_resistors(code: str, value_ohm: float) -> None:
    assert first(code, "resistor").value == value_ohm


@pytest.mark.parametrize(("code", "value_f"), CODES["capacitor_letter"].items())
def test_letters_replace_the_decimal_mark_of_capacitors(code: str, value_f: float) -> None:
    assert found(code) == [("capacitor", value_f)]


@pytest.mark.parametrize(("code", "value_f"), CODES["three_digit_picofarads"].items())
def test_three_digits_are_picofarads_with_a_power_of_ten(code: str, value_f: float) -> None:
    assert first(code, "capacitor").value == value_f


@pytest.mark.parametrize(("letter", "percent"), CODES["tolerance_pct"].items())
def test_tolerance_letters_hold_for_both_kinds(letter: str, percent: list[float]) -> None:
    sides = tuple(side / 100 for side in percent)
    assert resistor_tolerance(letter).sides_rel == sides
    assert capacitor_tolerance(letter, 1e-7).sides_rel == sides


@pytest.mark.parametrize(("letter", "percent"), CODES["capacitor_tolerance_pct"].items())
def test_asymmetric_letters_belong_to_capacitors(letter: str, percent: list[float]) -> None:
    sides = tuple(side / 100 for side in percent)
    assert first(f"103{letter}", "capacitor").tolerance_rel == sides
    assert resistor_tolerance(letter) is None


@pytest.mark.parametrize(("letter", "picofarads"), CODES["tolerance_picofarads_below_10"].items())
def test_below_10_pf_letters_are_picofarads(letter: str, picofarads: float) -> None:
    reading = first(f"479{letter}", "capacitor")
    assert reading.tolerance_rel == pytest.approx((-picofarads / 4.7, picofarads / 4.7), rel=1e-12)
    assert f"±{picofarads:g} pF" in reading.tolerance_from
    percent = CODES["tolerance_pct"][letter][1]
    assert first(f"100{letter}", "capacitor").tolerance_rel == (-percent / 100, percent / 100)


def test_the_letter_e_is_explained_and_not_guessed() -> None:
    reading = first("472E", "capacitor")
    assert reading.value == 4.7e-9
    assert reading.tolerance_rel is None
    assert any("0.5 %" in note and "0.005 %" in note for note in reading.notes)


@pytest.mark.parametrize(("name", "digit"), CODES["colour_digit"].items())
def test_bands_give_digits_and_powers_of_ten(name: str, digit: int) -> None:
    assert first(f"yellow violet {name} gold", "resistor").value == float(f"47e{digit}")
    if digit:
        wanted = float(f"{digit}2e1")
        assert wanted in [item.value for item in decode(f"{name} red brown gold")]


@pytest.mark.parametrize(("name", "exponent"), CODES["colour_exponent"].items())
def test_metal_and_pink_bands_divide(name: str, exponent: int) -> None:
    assert first(f"yellow violet {name} gold", "resistor").value == float(f"47e{exponent}")


@pytest.mark.parametrize(("name", "percent"), CODES["colour_tolerance_pct"].items())
def test_tolerance_bands(name: str, percent: float) -> None:
    reading = next(
        item for item in decode(f"orange orange yellow {name}") if item.value == 330_000.0
    )
    assert reading.tolerance_rel == (-percent / 100, percent / 100)


@pytest.mark.parametrize(("name", "ppm"), CODES["colour_tempco_ppm"].items())
def test_the_sixth_band_is_the_temperature_coefficient(name: str, ppm: float) -> None:
    reading = next(
        item for item in decode(f"orange orange black orange brown {name}") if item.value == 330e3
    )
    assert reading.tempco_per_k == ppm / 1e6


def test_three_bands_are_20_percent() -> None:
    assert first("red red orange", "resistor").tolerance_rel == (-0.2, 0.2)


def test_bands_that_read_from_both_ends_give_both() -> None:
    assert found("brown black black red brown") == [("resistor", 10_000.0), ("resistor", 120.0)]


def test_bands_held_the_wrong_way_round_are_read_from_the_other_end() -> None:
    (reading,) = decode("gold red violet yellow")
    assert reading.value == 4700.0
    assert "other end" in reading.how


@pytest.mark.parametrize("text", ["YE VT RD GD", "yellow purple red gold"])
def test_other_names_of_colours(text: str) -> None:
    assert found(text) == [("resistor", 4700.0)]
    assert colour("mauve") is None


@pytest.mark.parametrize(("code", "figures"), CODES["class_2"].items())
def test_class_2_codes(code: str, figures: list[float]) -> None:
    low, high, least, most = figures
    says = temperature_class(code).says
    assert says.endswith(f"between {low} and {high} °C")
    assert (f"±{most:g} %" if least == -most else f"{least:g} % or {most:+g} %") in says


@pytest.mark.parametrize(("code", "figures"), CODES["class_1"].items())
def test_class_1_codes(code: str, figures: list[float]) -> None:
    ppm, tolerance = figures
    found_class = temperature_class(code)
    assert found_class.tempco_per_k == pytest.approx(ppm * 1e-6, rel=1e-12, abs=0)
    assert f"±{tolerance} ppm/K" in found_class.says


def test_np0_is_c0g_and_a_class_alone_is_read() -> None:
    (reading,) = decode("NP0")
    assert (reading.temperature_code, reading.value) == ("C0G", None)


def test_a_bare_three_digit_code_gives_both_kinds_with_the_reason() -> None:
    capacitor, resistor = decode("472")
    assert (capacitor.kind, capacitor.value) == ("capacitor", 4.7e-9)
    assert (resistor.kind, resistor.value) == ("resistor", 4700.0)
    assert "pF" in capacitor.how
    assert "chip resistor" in resistor.how


def test_a_class_or_a_voltage_settles_that_it_is_a_capacitor() -> None:
    (reading,) = decode("472 X7R 50V")
    assert reading.value == 4.7e-9
    assert reading.rated_voltage_v == 50.0
    assert "±15 %" in reading.temperature_note


def test_a_known_kind_leaves_the_other_out() -> None:
    assert [item.kind for item in decode("472", kind="resistor")] == ["resistor"]
    with pytest.raises(UnitError, match="marking of a resistor"):
        decode("4n7", kind="resistor")


@pytest.mark.parametrize(
    ("text", "readings"),
    [
        ("47K", [("resistor", 47e3), ("capacitor", 47e-12)]),
        ("4701", [("resistor", 4700.0)]),
        ("4700", [("capacitor", 4.7e-9), ("resistor", 470.0)]),
        ("100", [("capacitor", 10e-12), ("capacitor", 100e-12), ("resistor", 10.0)]),
        ("R010", [("resistor", 0.01)]),
        ("000", [("resistor", 0.0)]),
        ("0.1", [("capacitor", 1e-7)]),
        ("4.7", [("capacitor", 4.7e-12), ("capacitor", 4.7e-6)]),
        ("47uF 25V", [("capacitor", 47e-6)]),
        ("47 μF 25 V", [("capacitor", 47e-6)]),
        ("47uF/25V", [("capacitor", 47e-6)]),
        ("47/25", [("capacitor", 47e-6)]),
        ("10MFD", [("capacitor", 10e-6)]),
        ("330 kohm 1%", [("resistor", 330e3)]),
        ("4K7J", [("resistor", 4700.0)]),
        ("1F 5.5V", [("capacitor", 1.0)]),
        ("103J", [("capacitor", 10e-9), ("resistor", 10e3)]),
        ("black", [("resistor", 0.0)]),
    ],
)
def test_every_sound_reading_is_given_the_likeliest_first(
    text: str, readings: list[tuple[str, float]]
) -> None:
    assert found(text) == readings


@pytest.mark.parametrize(
    ("text", "volts"),
    [
        ("47/25", 25.0),
        ("47uF 25V", 25.0),
        ("103J100", 100.0),
        (".047K100", 100.0),
        ("1kV 102", 1e3),
        ("2A103J", 100.0),
        ("1H104K", 50.0),
        ("C106", 16.0),
    ],
)
def test_rated_voltages(text: str, volts: float) -> None:
    assert first(text, "capacitor").rated_voltage_v == volts


@pytest.mark.parametrize("text", ["4n7 5%", "4n7 ±5 %", "4n7J", "4n7 J"])
def test_tolerances_stand_in_letters_and_in_words(text: str) -> None:
    assert first(text, "capacitor").tolerance_rel == (-0.05, 0.05)


def test_a_letter_that_may_be_farads_or_one_percent_gives_both() -> None:
    assert [item.tolerance_rel for item in decode("4n7F")] == [None, (-0.01, 0.01)]


@given(index=st.integers(1, 96), letter=st.sampled_from("ABCDEF"))
def test_eia_96_is_the_place_in_the_e96_series(index: int, letter: str) -> None:
    """Multipliers A to F are 1 to 100000 (from memory); 68C is 499 times 100."""
    wanted = float(f"{round(100 * values('E96')[index - 1])}e{'ABCDEF'.index(letter)}")
    assert ("resistor", wanted) in found(f"{index:02d}{letter}")


def test_eia_96_ends_at_96() -> None:
    with pytest.raises(UnitError):
        decode("97A")


def test_voltage_codes() -> None:
    assert voltage_code("0J") == 6.3
    assert voltage_code("2E") == 250.0
    assert voltage_code("4A") is None


def test_an_odd_value_is_read_with_a_doubt() -> None:
    reading = first("483", "capacitor")
    assert not reading.preferred
    assert "no E-series" in reading.notes[-1]


@pytest.mark.parametrize(
    "text", ["", "foo", "103 foo", "048", "100V", "K", "gold red", "gold gold gold", "103 104"]
)
def test_what_cannot_be_read_is_a_usage_error_that_shows_what_can(text: str) -> None:
    with pytest.raises(UnitError) as refused:
        decode(text)
    assert "104K" in refused.value.hint
    if text == "103 foo":
        assert refused.value.message == "cannot read 'foo' in '103 foo' as a part marking"


def test_words_of_a_command_line_are_grouped_into_parts() -> None:
    line = "103 50V yellow violet red gold 4n7K X7R 47 uF 25 V red red orange"
    assert split_markings(line.split()) == (
        "103 50V",
        "yellow violet red gold",
        "4n7K X7R",
        "47 uF 25 V",
        "red red orange",
    )
    assert split_markings(["47uF 25V", "103"]) == ("47uF 25V", "103")


@given(st.text(alphabet="0123456789.pnuµmFRKMLGJX7 V%/", max_size=7))
def test_any_text_is_read_or_refused_in_words(text: str) -> None:
    try:
        readings = decode(text)
    except UnitError:
        return
    assert readings
    assert all(item.value is None or item.value >= 0 for item in readings)


@given(mantissa=st.sampled_from(values("E24")), exponent=st.integers(0, 6))
def test_bands_painted_from_a_value_read_back_as_it(mantissa: float, exponent: int) -> None:
    digits = f"{round(mantissa * 10)}"
    names = [COLOURS[int(digit)] for digit in digits] + [COLOURS[exponent], "gold"]
    assert found(" ".join(names)) == [("resistor", float(f"{digits}e{exponent}"))]
