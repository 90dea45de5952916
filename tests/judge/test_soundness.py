"""Physics of ``design check``: each concern provoked alone, and a sound design left in peace."""

from collections.abc import Mapping

import pytest
from judged_boards import board, ideal_ic, limit, part, single

from benchtool.circuits import circuit_at, predict
from benchtool.judge.soundness import examine
from benchtool.model.decision import Concern
from benchtool.model.design import Band, Design, Ic, Instrument, Part, Probe, Rule, Stage

CMOS = Ic(family="cmos")


def _concerns(case: tuple[Stage, Design], **options: float) -> dict[str, Concern]:
    found = examine(case[1], **options)
    keys = [concern.key for concern in found]
    assert len(keys) == len(set(keys))
    return {concern.key: concern for concern in found}


def _parts(**changed: Part) -> Mapping[str, Part]:
    return {
        "RA": part("RA", 100e3, 0.01),
        "RB": part("RB", 330e3, 0.01),
        "C": part("C", 47e-6, 0.1, kind="electrolytic", leakage_a=0.5e-6),
    } | changed


def _sound(**stage: object) -> tuple[Stage, Design]:
    return board(
        _parts(),
        ic=CMOS,
        supply=Band(nominal=12.0, lower=11.4, upper=12.6),
        **({"derive": "worst-case", "quantities": ("t_high", "t_low", "period", "duty")} | stage),
    )


def test_a_sound_design_raises_no_concern() -> None:
    assert examine(_sound()[1]) == ()
    assert examine(_sound(limits=(limit("period", 20.0, 30.0),))[1]) == ()


@pytest.mark.parametrize(
    ("leakage_a", "severity", "key"),
    [(25e-6, "error", "stage.spacing.C.leakage"), (12e-6, "warning", "stage.spacing.C.leakage")],
)
def test_a_leakage_that_keeps_the_node_from_its_threshold(
    leakage_a: float, severity: str, key: str
) -> None:
    parts = _parts(C=part("C", 47e-6, 0.1, leakage_a=leakage_a))
    concern = _concerns(board(parts, ic=CMOS))[key]
    assert concern.severity == severity
    assert "below the upper threshold 8 V" in concern.text


def test_parts_that_only_stop_the_circuit_together() -> None:
    """8.9 µA stops the dearest corner alone: 4 V over 430 kΩ is 9.3 µA."""
    parts = _parts(
        RA=part("RA", 100e3, 0.05), RB=part("RB", 330e3, 0.05), C=part("C", 47e-6, leakage_a=9e-6)
    )
    concern = _concerns(board(parts, ic=ideal_ic()))["stage.spacing"]
    assert concern.severity == "warning"
    assert "together" in concern.text


def test_a_leak_resistance_that_stops_the_nominal_board() -> None:
    concern = _concerns(board(_parts(), ic=CMOS, leak_ohm=500e3))["stage.spacing.leak"]
    assert concern.severity == "error"


def test_a_supply_that_cannot_reach_a_stated_threshold() -> None:
    case = board(_parts(), ic=CMOS, control_v=12.5)
    assert _concerns(case)["stage.spacing"].severity == "error"


def test_a_probe_at_the_capacitor_that_shifts_the_result() -> None:
    probe = Probe(r_ohm=10e6, c_f=12e-12, at="capacitor")
    case = board(_parts(), ic=CMOS, design={"probe": probe})
    loaded, free = (predict(circuit_at(case[0], d)) for d in (case[1], board(_parts(), ic=CMOS)[1]))
    shift = 100 * (loaded.t_high / free.t_high - 1)
    assert f"t_high by {shift:+.2g} %" in _concerns(case)["probe.at"].text
    assert shift > 4


def test_a_probe_at_the_output_shifts_nothing() -> None:
    probe = Probe(r_ohm=1e6, c_f=12e-12, at="output")
    assert "probe.at" not in _concerns(board(_parts(), ic=CMOS, design={"probe": probe}))


def test_a_probe_that_stops_the_board() -> None:
    probe = Probe(r_ohm=500e3, at="capacitor")
    concern = _concerns(board(_parts(), ic=CMOS, design={"probe": probe}))["probe.at"]
    assert concern.severity == "error"
    assert "the probe keeps the node" in concern.text


@pytest.mark.parametrize("upper", [0.45, 0.5])
def test_a_duty_that_the_astable_cannot_give(upper: float) -> None:
    case = _sound(limits=(limit("duty", 0.3, upper, unit="1"),))
    concern = _concerns(case)["stage.spacing.limits.duty"]
    assert concern.severity == "error"
    assert "always above 50 %" in concern.text


def test_a_limit_that_the_nominal_board_misses() -> None:
    concern = _concerns(_sound(limits=(limit("period", 10.0, 20.0),)))[
        "stage.spacing.limits.period"
    ]
    assert concern.severity == "error"
    assert "period = 24.881 s" in concern.text
    assert "at least 10 s and at most 20 s" in concern.text


def test_limits_narrower_than_the_tolerances_reject_a_stated_share() -> None:
    """C alone, rectangular ±10 %: of R·C·ln 3 ± 8 % one board in five lies outside."""
    parts = single(part("R", 330e3), part("C", 47e-6, 0.1))
    pulse = 330e3 * 47e-6 * 1.0986122886681098
    case = board(
        parts,
        topology="one-shot",
        ic=ideal_ic(),
        limits=(limit("t_high", 0.92 * pulse, 1.08 * pulse),),
    )
    concern = _concerns(case)["stage.spacing.limits.t_high"]
    assert concern.severity == "warning"
    assert "About 20 % of the boards" in concern.text


def test_limits_narrower_than_u_can_pass_nothing() -> None:
    case = _sound(limits=(limit("period", 24.5, 25.2),))
    concerns = examine(case[1], expected_u_rel=0.01)
    narrow = [item for item in concerns if "from each side" in item.text]
    assert [item.key for item in narrow] == ["stage.spacing.limits.period"]
    assert narrow[0].severity == "error"


def test_the_timebase_alone_is_the_least_u() -> None:
    loose = board(
        _parts(),
        ic=CMOS,
        limits=(limit("period", 24.8, 24.9),),
        design={"instrument": Instrument(timebase_rel=0.01)},
    )
    assert any("from each side" in item.text for item in examine(loose[1]))
    tight = board(_parts(), ic=CMOS, limits=(limit("period", 24.8, 24.9),))
    assert not any("from each side" in item.text for item in examine(tight[1]))


def test_the_simple_rule_needs_no_room_for_u() -> None:
    case = board(
        _parts(),
        ic=CMOS,
        limits=(limit("period", 24.8, 24.9),),
        design={"rule": Rule(name="simple")},
    )
    assert not any("from each side" in item.text for item in examine(case[1], expected_u_rel=0.1))


@pytest.mark.parametrize(
    ("family", "ohms", "current"), [("bipolar", 500.0, "25.5 mA"), ("cmos", 100.0, "127 mA")]
)
def test_a_first_resistor_too_small_for_the_discharge_switch(
    family: str, ohms: float, current: str
) -> None:
    parts = _parts(RA=part("RA", ohms, 0.01))
    case = board(parts, ic=Ic(family=family), supply=Band(nominal=12.0, lower=11.4, upper=12.6))
    concern = _concerns(case)["stage.spacing.RA"]
    assert f"sinks {current}" in concern.text


def test_a_first_resistor_below_the_published_range() -> None:
    concern = _concerns(board(_parts(RA=part("RA", 820.0)), ic=CMOS))["stage.spacing.RA"]
    assert "below the 1 kΩ" in concern.text


@pytest.mark.parametrize(
    ("supply_v", "total_ohm", "concerned"),
    [(5.0, 3.5e6, True), (5.0, 3.3e6, False), (15.0, 10.1e6, True), (15.0, 9.9e6, False)],
)
def test_resistance_beyond_the_published_total(
    supply_v: float, total_ohm: float, concerned: bool
) -> None:
    """SLFS022: RA + RB at most 3.4 MΩ at 5 V and 10 MΩ at 15 V for the bipolar timer."""
    parts = {
        "RA": part("RA", total_ohm / 2),
        "RB": part("RB", total_ohm / 2),
        "C": part("C", 1e-6, kind="film"),
    }
    supply = Band(nominal=supply_v, lower=supply_v, upper=supply_v)
    case = board(parts, ic=Ic(family="bipolar"), supply=supply)
    assert ("stage.spacing.RA" in _concerns(case)) is concerned
    assert "stage.spacing.RA" not in _concerns(board(parts, ic=CMOS, supply=supply))


def test_an_electrolytic_capacitor_without_a_stated_leakage() -> None:
    silent = _parts(C=part("C", 47e-6, 0.1, kind="Electrolytic"))
    concern = _concerns(board(silent, ic=CMOS))["stage.spacing.C"]
    assert concern.severity == "warning"
    assert "5.6 µA" in concern.text
    film = _parts(C=part("C", 1e-6, 0.1, kind="film"))
    assert _concerns(board(film, ic=CMOS)) == {}


def test_delays_that_make_up_much_of_a_short_period() -> None:
    parts = {"RA": part("RA", 10e3), "RB": part("RB", 10e3), "C": part("C", 1e-9, kind="film")}
    concern = _concerns(board(parts, ic=CMOS))["stage.spacing.ic"]
    assert "delays of the IC" in concern.text
    slow = parts | {"C": part("C", 100e-9, kind="film")}
    assert _concerns(board(slow, ic=CMOS)) == {}


def test_a_time_that_the_topology_does_not_have() -> None:
    parts = single(part("R", 330e3, 0.01), part("C", 47e-6, 0.1, leakage_a=1e-7))
    case = board(
        parts,
        topology="one-shot",
        ic=CMOS,
        limits=(limit("t_low", 1.0, 2.0),),
        quantities=("delay",),
    )
    concerns = _concerns(case)
    assert concerns["stage.spacing.limits.t_low"].severity == "error"
    assert concerns["stage.spacing.limits.quantities"].severity == "error"
