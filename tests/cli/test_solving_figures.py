"""``solve`` from plain figures and from captures, against values worked by hand."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import pytest
from captures import C_F, RA_OHM, RB_OHM, T_HIGH_S, T_LOW_S, write_square
from running import Ran, run_here

Capsys = pytest.CaptureFixture[str]
LN2, LN3 = math.log(2), math.log(3)
DELAY_S = 1e-6  # some times the switching delay of a CMOS timer, 0.14 µs, which the model takes off


def solve(capsys: Capsys, *arguments: str | Path) -> Ran:
    return run_here(capsys, "solve", *arguments, "--json")


def circuit(ran: Ran) -> dict[str, Any]:
    assert ran.code == 0, ran.out
    found: dict[str, Any] = ran.document["results"][0]["circuit"]
    return found


def parts(ran: Ran) -> dict[str, Any]:
    return {part["ref"]: part for part in circuit(ran)["parts"] if part["estimate"]}


def codes(ran: Ran) -> set[str]:
    return {notice["code"] for notice in ran.document["results"][0]["warnings"]}


def test_the_products_of_an_astable_are_its_times_over_ln_2(capsys: Capsys) -> None:
    found = circuit(solve(capsys, "--topology", "astable", "--high", "14.01s", "--low", "10.75s"))
    assert found["tau_charge"]["value"] == pytest.approx(14.01 / LN2, abs=DELAY_S)
    assert found["tau_discharge"]["value"] == pytest.approx(10.75 / LN2, abs=DELAY_S)
    assert found["tau_RA"]["value"] == pytest.approx((14.01 - 10.75) / LN2, abs=DELAY_S)
    assert found["tau_ratio"]["value"] == pytest.approx(14.01 / 10.75, abs=DELAY_S)
    assert found["parts"] == []


def test_the_first_high_after_power_up_weighs_in(capsys: Capsys) -> None:
    times = ("--topology", "astable", "--high", "14.01s", "--low", "10.75s")
    without = circuit(solve(capsys, *times))["tau_charge"]
    with_it = circuit(solve(capsys, *times, "--first", "22.20s"))["tau_charge"]
    # both say 20.21 s: 14.01/ln 2 and 22.20/ln 3; together they are worth more
    assert with_it["value"] == pytest.approx(22.20 / LN3, rel=2e-3)
    assert with_it["u"] < 0.9 * without["u"]


def test_a_known_resistor_gives_the_capacitor(capsys: Capsys) -> None:
    ran = solve(
        capsys,
        *("--topology", "astable", "--high", "14.01s", "--low", "10.75s"),
        "--known",
        "RB=330k",
    )
    found = parts(ran)
    assert found.keys() == {"RA", "C"}
    assert found["C"]["estimate"]["value"] == pytest.approx(10.75 / (330e3 * LN2), rel=2e-3)
    # the on-resistance of the IC's switch, tens of ohms, moves RA by some parts in a thousand
    assert found["RA"]["estimate"]["value"] == pytest.approx(330e3 * 3.26 / 10.75, rel=5e-3)
    assert found["C"]["estimate"]["unit"] == "F"
    assert any("RB" in words and "330" in words for words in found["C"]["assumes"])


def test_a_one_shot_is_its_pulse_over_ln_3(capsys: Capsys) -> None:
    found = circuit(solve(capsys, "--topology", "one-shot", "--high", "3.511 s"))
    assert found["tau_charge"]["value"] == pytest.approx(3.511 / LN3, abs=DELAY_S)


def test_a_power_on_delay_is_its_time_over_ln_3(capsys: Capsys) -> None:
    found = circuit(solve(capsys, "--topology", "power-on", "--delay", "5.2 s"))
    assert found["tau_charge"]["value"] == pytest.approx(5.2 / LN3, abs=DELAY_S)


def test_one_resistor_from_the_output_is_the_period_over_2_ln_2(capsys: Capsys) -> None:
    ran = solve(capsys, "--topology", "output-fed", "--high", "1.000 s", "--low", "1.000 s")
    assert circuit(ran)["tau_charge"]["value"] == pytest.approx(1 / LN2, abs=DELAY_S)


def test_a_schmitt_inverter_needs_its_thresholds(capsys: Capsys) -> None:
    times = ("--topology", "schmitt", "--high", "0.402s", "--low", "0.437s", "--supply", "12")
    assert solve(capsys, *times).code == 2
    given = ("--upper-threshold", "60%", "--lower-threshold", "40%")
    tau_s = circuit(solve(capsys, *times, *given))["tau_charge"]["value"]
    assert tau_s == pytest.approx(
        0.42 / math.log(1.5), rel=0.05
    )  # 0.402/… and 0.437/… are its ends


def test_figures_are_good_to_their_last_digit_and_it_is_said(capsys: Capsys) -> None:
    ran = solve(capsys, "--topology", "astable", "--high", "14.01s", "--low", "10750ms")
    timing = ran.document["results"][0]["timing"]
    assert timing["t_high"]["u"] == pytest.approx(0.01 / math.sqrt(12))  # JCGM 100 F.2.2.1
    assert timing["t_low"]["u"] == pytest.approx(0.001 / math.sqrt(12))
    assert {"assumed-last-digit", "assumed-family", "assumed-supply"} <= codes(ran)


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        ([], "--design"),
        (["--topology", "astable"], "--high"),
        (["--topology", "astable", "--high", "14"], "--low"),
        (["--topology", "astable", "--high", "-1s", "--low", "1s"], "greater than 0"),
        (["--topology", "astable", "--high", "fast", "--low", "1s"], "--high"),
        (["--topology", "astable", "--high", "14s", "--low", "10s", "--known", "RB"], "--known"),
        (["--topology", "astable", "--high", "14s", "--low", "10s", "--known", "RX=1k"], "--known"),
        (["--topology", "astable", "--high", "14s", "--low", "10s", "--known", "RB=1uF"], "RB"),
        (["GOOD", "--topology", "astable", "--high", "14s"], "--high"),
        (["GOOD", "--topology", "astable", "--design", "DESIGN"], "--topology"),
        (["GOOD", "--design", "DESIGN", "--stage", "pulse"], "spacing"),
        (["GOOD", "--design", "DESIGN", "--supply", "5 V"], "--supply"),
        (["GOOD", "--design", "DESIGN", "--upper-threshold", "60%"], "--upper-threshold"),
        (["GOOD", "--topology", "astable", "--probe", "10M 12p"], "--probe"),
        (["GOOD", "--topology", "astable", "--temperature", "40"], "--temperature"),
        (["GOOD", "--topology", "astable", "--stage", "spacing"], "--stage"),
    ],
)
def test_options_that_contradict_or_lack_something(
    capsys: Capsys, good: Path, design: Path, arguments: list[str], says: str
) -> None:
    places = {"GOOD": str(good), "DESIGN": str(design)}
    ran = solve(capsys, *(places.get(word, word) for word in arguments))
    error = ran.document["error"]
    assert ran.code == 2
    assert says in f"{error['message']} {error['hint']}"


def test_with_a_design_a_part_is_compared_with_its_marking(
    capsys: Capsys, tmp_path: Path, design: Path
) -> None:
    low = write_square(tmp_path / "low.csv", t_high_s=0.8 * T_HIGH_S, t_low_s=0.8 * T_LOW_S)
    found = parts(solve(capsys, low, "--design", design))["C"]
    # the leakage of up to 0.5 µA, half of it nominal, takes 1.5 %; U covers the truth
    assert found["estimate"]["value"] == pytest.approx(0.8 * C_F, abs=found["estimate"]["U"])
    assert found["change"]["value"] == pytest.approx(-0.2, abs=found["change"]["U"])
    assert found["within_tolerance"] is False
    assert found["nominal"] == C_F


def test_what_is_known_is_not_estimated(capsys: Capsys, good: Path, design: Path) -> None:
    ran = solve(capsys, good, "--design", design, "--known", f"RB={RB_OHM}", "--known", f"C={C_F}")
    found = parts(ran)
    assert found.keys() == {"RA"}
    assert found["RA"]["estimate"]["value"] == pytest.approx(
        RA_OHM, abs=found["RA"]["estimate"]["U"]
    )


def test_a_part_that_the_topology_lacks_cannot_be_known(
    capsys: Capsys, good: Path, design: Path
) -> None:
    assert solve(capsys, good, "--design", design, "--known", "R=10k").code == 2
