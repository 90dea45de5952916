"""The likeliest part: one moved part in, its name out, and silence where it cannot be told."""

import pytest
from judged_boards import board, part, single

from benchtool.circuits import circuit_at, predict
from benchtool.judge.likely import name_likely_part
from benchtool.model.design import Design, Ic, Stage
from benchtool.model.quantity import Bound, Measured
from benchtool.model.timing import Timing


def _seen(stage: Stage, design: Design, **moved: float) -> Timing:
    """Return what a board with moved parts shows, to 100 ppm."""
    found = predict(circuit_at(stage, design, moved))
    names = ("t_high", "t_low", "delay")
    values = {name: getattr(found, name) for name in names if getattr(found, name) is not None}
    return Timing(**{name: Measured(value=v, u=1e-4 * v, unit="s") for name, v in values.items()})


@pytest.mark.parametrize("family", ["cmos", "bipolar"])
@pytest.mark.parametrize(
    ("factor", "words"),
    [(0.8, "C 20 % low"), (0.75, "C 25 % low"), (1.3, "C 30 % high"), (2.0, "C 100 % high")],
)
def test_a_moved_capacitor_is_named_with_its_change(family: str, factor: float, words: str) -> None:
    case = board(ic=Ic(family=family))
    sentence = name_likely_part(*case, _seen(*case, C=47e-6 * factor))
    assert sentence == f"{words} would explain both times."


def test_a_wrong_discharge_resistor_is_named() -> None:
    case = board(ic=Ic(family="cmos"))
    assert name_likely_part(*case, _seen(*case, RB=180e3)) == (
        "RB 45 % low would explain both times."
    )


@pytest.mark.parametrize("moved", [{"RA": 180e3}, {"upper_threshold": 0.08}])
def test_the_first_resistor_is_never_told_from_the_control_pin(moved: dict[str, float]) -> None:
    case = board(ic=Ic(family="cmos"))
    sentence = name_likely_part(*case, _seen(*case, **moved)) or ""
    assert "RA" in sentence
    assert "control pin" in sentence
    assert "C 1" not in sentence


def test_a_strong_leak_is_named() -> None:
    parts = {
        "RA": part("RA", 100e3, 0.01),
        "RB": part("RB", 330e3, 0.01),
        "C": part("C", 47e-6, 0.1, leakage_a=0.5e-6),
    }
    case = board(parts, ic=Ic(family="cmos"))
    sentence = name_likely_part(*case, _seen(*case, leakage=4e-6))
    assert sentence == "A leak at the capacitor would explain both times."


@pytest.mark.parametrize("moved", [{}, {"C": 47e-6 * 1.08}, {"RA": 101e3, "RB": 327e3}])
def test_a_board_inside_its_tolerances_has_no_suspect(moved: dict[str, float]) -> None:
    case = board(ic=Ic(family="cmos"))
    assert name_likely_part(*case, _seen(*case, **moved)) is None


def test_a_change_inside_the_tolerance_has_no_suspect_though_it_fits_one() -> None:
    """With an ideal IC C alone fits +8 % exactly; ±10 % allow it."""
    case = board()
    assert name_likely_part(*case, _seen(*case, C=47e-6 * 1.08)) is None
    assert name_likely_part(*case, _seen(*case, C=47e-6 * 1.2)) == (
        "C 20 % high would explain both times."
    )


def test_times_that_no_single_change_explains_have_no_suspect() -> None:
    """A weak discharge switch lengthens the low time alone: no part of the list does."""
    case = board(ic=Ic(family="cmos"))
    assert name_likely_part(*case, _seen(*case, discharge_resistance=30e3)) is None


def test_one_time_gives_the_product_and_says_that_it_is_no_more() -> None:
    parts = single(part("R", 330e3, 0.01), part("C", 47e-6, 0.1))
    case = board(parts, topology="one-shot", ic=Ic(family="cmos"))
    sentence = name_likely_part(*case, _seen(*case, C=47e-6 * 1.4))
    assert sentence == (
        "R·C 40 % high would explain the time; "
        "the output alone cannot tell R, C and the thresholds apart."
    )


def test_one_resistor_and_its_capacitor_are_named_together() -> None:
    parts = single(part("R", 330e3, 0.01), part("C", 1e-6, 0.05))
    case = board(parts, topology="output-fed", ic=Ic(family="cmos"))
    sentence = name_likely_part(*case, _seen(*case, C=0.7e-6)) or ""
    assert "C 30 % low" in sentence
    assert "R 30 % low" in sentence


def test_without_both_times_nothing_is_named() -> None:
    case = board(ic=Ic(family="cmos"))
    half = Timing(
        t_high=Measured(value=20.0, u=0.01, unit="s"), t_low=Bound(unit="s", at_least=30.0)
    )
    assert name_likely_part(*case, half) is None
    assert name_likely_part(*case, None) is None


def test_a_dividing_output_names_nothing() -> None:
    case = board(ic=Ic(family="cmos"), divide=4)
    seen = _seen(*board(ic=Ic(family="cmos")), C=30e-6)
    assert name_likely_part(*case, seen) is None


def test_a_nominal_board_that_stands_still_names_nothing() -> None:
    parts = {
        "RA": part("RA", 100e3, 0.01),
        "RB": part("RB", 330e3, 0.01),
        "C": part("C", 47e-6, 0.1, leakage_a=50e-6),
    }
    seen = Timing(
        t_high=Measured(value=20.0, u=0.01, unit="s"), t_low=Measured(value=9.0, u=0.01, unit="s")
    )
    assert name_likely_part(*board(parts, ic=Ic(family="cmos")), seen) is None
