"""``judge`` on boards that are dead, slow or hardly recorded, and on boards of several stages."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from captures import (
    DESIGN,
    HEAD,
    SPACING,
    T_HIGH_S,
    T_LOW_S,
    node_v,
    sample_times,
    square_edges,
    square_v,
    write_columns,
    write_flat,
    write_square,
)
from running import Ran, run_here

Capsys = pytest.CaptureFixture[str]
SECOND = SPACING.replace("stage.spacing", "stage.drain").replace('"OUT"', '"DRAIN"')


def judge(capsys: Capsys, *arguments: str | Path) -> Ran:
    return run_here(capsys, "judge", *arguments, "--json")


def first_result(ran: Ran) -> dict[str, Any]:
    found: dict[str, Any] = ran.document["results"][0]
    return found


def checks_of(ran: Ran) -> dict[str, Any]:
    return {check["quantity"]: check for check in first_result(ran)["checks"]}


@pytest.mark.parametrize(("level_v", "state"), [(12.0, "high"), (0.02, "low")])
def test_a_stuck_output_fails(
    capsys: Capsys, tmp_path: Path, design: Path, level_v: float, state: str
) -> None:
    ran = judge(capsys, write_flat(tmp_path / "stuck.csv", level_v), "--design", design)
    assert ran.code == 1
    assert ran.document["verdict"] == "fail"
    finding = first_result(ran)["findings"][0]
    assert finding["code"] == f"stuck-{state}"
    assert finding["may_be"]
    assert "R-open" not in finding["may_be"]  # an astable has RA and RB
    verdicts = {name: check["verdict"] for name, check in checks_of(ran).items()}
    assert verdicts["period"] == verdicts["t_high"] == verdicts["t_low"] == "fail"


def test_a_short_flat_record_condemns_nobody(capsys: Capsys, tmp_path: Path, design: Path) -> None:
    short = write_flat(tmp_path / "short.csv", 12.0, n_samples=200)  # 10 s of at most 16.8 s
    ran = judge(capsys, short, "--design", design)
    assert ran.code != 1
    verdicts = {name: check["verdict"] for name, check in checks_of(ran).items()}
    assert verdicts["t_high"] == "undecided"
    assert "fail" not in verdicts.values()


def test_a_level_between_the_states_is_unusable(
    capsys: Capsys, tmp_path: Path, design: Path
) -> None:
    ran = judge(capsys, write_flat(tmp_path / "between.csv", 5.0), "--design", design)
    assert ran.code == 4
    assert {check["verdict"] for check in checks_of(ran).values()} == {"unusable"}
    assert first_result(ran)["findings"] == []


def test_a_record_shorter_than_a_period_fails_nothing(
    capsys: Capsys, tmp_path: Path, design: Path
) -> None:
    short = write_square(tmp_path / "short.csv", n_samples=200)
    ran = judge(capsys, short, "--design", design)
    assert ran.code in (3, 4)
    checks = checks_of(ran)
    assert checks["period"]["verdict"] == "undecided"
    assert checks["period"]["measured"]["at_least"] == pytest.approx(9.95, abs=0.051)
    assert "28 s" in checks["period"]["reason"]


def test_a_far_too_slow_board_fails_by_its_bound(
    capsys: Capsys, tmp_path: Path, design: Path
) -> None:
    slow = write_square(tmp_path / "slow.csv", t_high_s=200.0, t_low_s=150.0)
    ran = judge(capsys, slow, "--design", design)
    assert ran.code == 1
    check = checks_of(ran)["t_high"]
    assert check["verdict"] == "fail"
    assert check["measured"]["value"] is None
    assert check["measured"]["at_least"] > check["upper"]


def test_a_board_that_dies_in_the_record_fails(
    capsys: Capsys, tmp_path: Path, design: Path
) -> None:
    times_s = sample_times(4000)  # 200 s
    edges_s = square_edges(3)  # the last edge at 77 s, then high for ever
    dying = write_columns(tmp_path / "dying.csv", times_s, {"OUT": square_v(times_s, edges_s)})
    ran = judge(capsys, dying, "--design", design)
    assert ran.code == 1
    assert checks_of(ran)["t_high"]["verdict"] == "fail"


@pytest.mark.parametrize("tail_s", [0.5, 1.4, 1.6, 3.0, 8.0])
def test_a_good_node_passes_wherever_the_record_ends(
    capsys: Capsys, tmp_path: Path, design: Path, tail_s: float
) -> None:
    design.write_text(DESIGN.replace('channel = "OUT"', 'capacitor = "NODE"'))
    last_trough_s = 6 * (T_HIGH_S + T_LOW_S)
    times_s = sample_times(round((last_trough_s + tail_s) / 0.05))
    node = node_v(times_s, square_edges(8, first_s=0.0))
    path = write_columns(tmp_path / "node.csv", times_s, {"NODE": node})
    ran = judge(capsys, path, "--design", design)
    assert (ran.code, first_result(ran)["trace"]["role"]) == (0, "capacitor")


def two_outputs(tmp_path: Path, names: tuple[str, str] = ("OUT", "DRAIN")) -> Path:
    """Write a capture of two stages: the first as designed, the second 20 % fast."""
    times_s = sample_times()
    first = square_v(times_s, square_edges(8))
    fast = square_edges(10, t_high_s=0.8 * T_HIGH_S, t_low_s=0.8 * T_LOW_S, first_s=5.0)
    columns = {names[0]: first, names[1]: square_v(times_s, fast)}
    return write_columns(tmp_path / "two.csv", times_s, columns)


@pytest.fixture
def two_stages(tmp_path: Path) -> Path:
    path = tmp_path / "two.toml"
    path.write_text(DESIGN + SECOND)
    return path


def test_the_board_is_as_bad_as_its_worst_stage(
    capsys: Capsys, tmp_path: Path, two_stages: Path
) -> None:
    ran = judge(capsys, two_outputs(tmp_path), "--design", two_stages)
    verdicts = {item["stage"]: item["verdict"] for item in ran.document["results"]}
    assert verdicts == {"spacing": "pass", "drain": "fail"}
    assert (ran.code, ran.document["verdict"]) == (1, "fail")
    screen = run_here(capsys, "judge", two_outputs(tmp_path), "--design", two_stages).out
    assert "The board: FAIL" in screen


def test_one_stage_can_be_chosen(capsys: Capsys, tmp_path: Path, two_stages: Path) -> None:
    path = two_outputs(tmp_path)
    ran = judge(capsys, path, "--design", two_stages, "--stage", "spacing")
    assert (ran.code, len(ran.document["results"])) == (0, 1)
    wrong = judge(capsys, path, "--design", two_stages, "--stage", "pulse")
    assert wrong.code == 2
    assert wrong.document["error"]["code"] == "no-such-stage"
    assert "spacing, drain" in wrong.document["error"]["hint"]


@pytest.mark.parametrize("channel", ["DRAIN", "drain", "2"])
def test_a_channel_by_name_or_number(
    capsys: Capsys, tmp_path: Path, design: Path, channel: str
) -> None:
    ran = judge(capsys, two_outputs(tmp_path), "--design", design, "--channel", channel)
    assert ran.code == 1
    assert first_result(ran)["trace"]["channel"] == "DRAIN"


@pytest.mark.parametrize("channel", ["DRIAN", "0", "3", ""])
def test_a_wrong_channel_lists_those_there_are(
    capsys: Capsys, tmp_path: Path, design: Path, channel: str
) -> None:
    ran = judge(capsys, two_outputs(tmp_path), "--design", design, "--channel", channel)
    assert ran.code == 2
    assert ran.document["error"]["code"] == "no-such-channel"
    assert "OUT, DRAIN" in ran.document["error"]["hint"]


def test_one_channel_cannot_serve_two_stages(
    capsys: Capsys, tmp_path: Path, two_stages: Path
) -> None:
    path = two_outputs(tmp_path)
    assert judge(capsys, path, "--design", two_stages, "--channel", "OUT").code == 2
    chosen = ("--stage", "drain", "--channel", "OUT")
    assert judge(capsys, path, "--design", two_stages, *chosen).code == 0


def test_a_stage_whose_channel_is_missing_is_refused_among_several(
    capsys: Capsys, tmp_path: Path, two_stages: Path
) -> None:
    ran = judge(capsys, two_outputs(tmp_path, ("OUT", "PUMP")), "--design", two_stages)
    assert ran.code == 2
    assert ran.document["error"]["code"] == "no-such-channel"


def test_a_lone_output_of_another_name_is_measured_with_a_word(
    capsys: Capsys, tmp_path: Path, design: Path
) -> None:
    path = write_square(tmp_path / "renamed.csv", channel="CH1")
    ran = judge(capsys, path, "--design", design)
    assert ran.code == 0
    notice = next(x for x in first_result(ran)["warnings"] if x["code"] == "assumed-channel")
    assert "'OUT'" in notice["text"]
    assert "'CH1'" in notice["text"]


def test_a_trace_is_found_under_the_second_name_of_the_design(
    capsys: Capsys, tmp_path: Path, design: Path
) -> None:
    design.write_text(DESIGN.replace('"OUT"', '"OUT"\ncapacitor = "NODE"'))
    times_s = sample_times()
    node = node_v(times_s, square_edges(8))
    supply = np.full_like(times_s, 12.0)
    path = write_columns(tmp_path / "node.csv", times_s, {"NODE": node, "VCC": supply})
    ran = run_here(capsys, "measure", path, "--json")
    assert first_result(ran)["trace"]["channel"] == "NODE"
    ran = judge(capsys, path, "--design", design)
    assert first_result(ran)["trace"]["channel"] == "NODE"
    assert all(x["code"] != "assumed-channel" for x in first_result(ran)["warnings"])


def test_two_stages_without_channels_need_them(
    capsys: Capsys, tmp_path: Path, design: Path
) -> None:
    design.write_text((DESIGN + SECOND).replace('channel = "OUT"\n', ""))
    ran = judge(capsys, two_outputs(tmp_path), "--design", design)
    assert (ran.code, ran.document["error"]["code"]) == (2, "choose-channel")


def test_a_fail_names_limit_percent_U_and_part(
    capsys: Capsys, tmp_path: Path, design: Path
) -> None:
    low = write_square(tmp_path / "low.csv", t_high_s=0.8 * T_HIGH_S, t_low_s=0.8 * T_LOW_S)
    ran = run_here(capsys, "judge", low, "--design", design)
    words = " ".join(ran.out.split())
    assert re.search(r"below its lower limit of 22 s by 9\.9\d* % of the limit", words)
    assert re.search(r"of the limit, [\d.]+ times its U\.", words)
    assert "C 20 % low" in words


@pytest.mark.parametrize("place", ['channel = "OUT"', 'capacitor = "NODE"'])
def test_the_probe_of_the_command_line_sits_where_the_design_says(
    capsys: Capsys, good: Path, design: Path, place: str
) -> None:
    def tau_s(probe: str, *more: str) -> float:
        table = f"\n[probe]\nR = {probe!r}\nC = '1p'\n" + (
            "at = 'capacitor'\n" if "OUT" in place else ""
        )
        design.write_text(DESIGN.replace('channel = "OUT"', place) + table)
        ran = judge(capsys, good, "--design", design, *more)
        return float(first_result(ran)["circuit"]["tau_charge"]["value"])

    told = tau_s("10M", "--probe", "5M 1p")
    if "OUT" in place:
        assert told == pytest.approx(tau_s("5M"), rel=1e-9)
    # dln t_high = 1.164·(RA+RB)/Rp = 10 % at 5 MΩ: the parts alone are so much smaller
    assert told == pytest.approx(20.21 * (1 - 0.10), rel=0.02)


def test_a_design_may_judge_jitter(capsys: Capsys, tmp_path: Path, design: Path) -> None:
    design.write_text(DESIGN + 'jitter_period = { upper = "0.2%" }\n')
    shaky = write_square(tmp_path / "shaky.csv", jitter_s=0.3, n_samples=6000)
    checks = checks_of(judge(capsys, shaky, "--design", design))
    assert checks["jitter_period"]["verdict"] == "fail"  # 0.42 s of 24.8 s is 1.7 %
    assert checks["jitter_period"]["unit"] == "s"


def test_each_topology_of_the_design_is_judged_by_its_own_quantities(
    capsys: Capsys, tmp_path: Path
) -> None:
    text = HEAD + (
        '[stage.pulse]\ntopology = "one-shot"\nchannel = "VALVE"\nR = "68k 1%"\n'
        'C = "47u 10%"\nic = "cmos"\n'
        '[stage.pulse.limits]\nderive = "rss"\nquantities = ["t_high"]\n'
    )
    design = tmp_path / "pulse.toml"
    design.write_text(text)
    pulse_s = 68e3 * 47e-6 * np.log(3)
    path = write_square(
        tmp_path / "pulse.csv", t_high_s=pulse_s, t_low_s=20.0, channel="VALVE", jitter_s=0.01
    )
    ran = judge(capsys, path, "--design", design)
    assert ran.code == 0
    assert checks_of(ran).keys() == {"t_high"}
    assert first_result(ran)["circuit"]["tau_charge"]["value"] == pytest.approx(3.196, rel=0.02)
