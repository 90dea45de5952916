"""The JSON contract: one document on stdout, its keys, its numbers, the same bytes again.

The expected keys are written out from the contract and not taken from the code. Within
``benchtool/1`` keys are only added, so each set must be contained in what is found.
"""

from __future__ import annotations

import json
import math
from collections.abc import Callable, Iterator
from importlib.resources import files
from pathlib import Path
from typing import Any

import jsonschema
import numpy as np
import pytest
from captures import DESIGN, write_flat, write_square
from running import Ran, run_apart, run_here

from benchtool.selftest.checks import SelfCheck

Capsys = pytest.CaptureFixture[str]
Run = Callable[..., Ran]

SCHEMA = json.loads((files("benchtool.report") / "document.schema.json").read_text("utf-8"))
VALIDATOR = jsonschema.Draft202012Validator(SCHEMA)

QUANTITY = {"value", "unit", "u", "dof", "k", "U", "n"}
DOCUMENT = {"schema", "command", "version", "made_at", "sources", "results", "warnings"}
SOURCE = {"role", "name", "sha256", "format", "structure"}
TRACE = {
    *("channel", "role", "kind", "samples", "sample_interval_s"),
    *("tick_s", "start_s", "duration_s", "gaps"),
}
TIMING = {"t_high", "t_low", "period", "frequency", "duty", "first_high", "delay", "drift"}
JITTER = {"period_sd", "period_pp", "cycle_rms", "cycle_peak", "grid_share"}
STABILITY = {"tau_s", "adev", "lower", "upper", "n"}
CIRCUIT = {
    *("topology", "tau_charge", "tau_discharge", "tau_RA", "tau_ratio", "effective", "parts"),
}
PART = {"ref", "nominal", "estimate", "change", "assumes", "within_tolerance"}
CHECK = {
    *("quantity", "measured", "lower", "upper", "unit", "accept_lower", "accept_upper"),
    *("source", "p_conform", "verdict"),
}
LOOKED = {"stage", "trace", "levels", "intervals", "findings", "warnings"}
MEASURED = {*LOOKED, "timing", "jitter", "stability"}
UNITS = {
    **dict.fromkeys(("t_high", "t_low", "period", "first_high", "delay"), "s"),
    "frequency": "Hz",
    "duty": "1",
    "drift": "1/s",
}


@pytest.fixture
def run(capsys: Capsys) -> Run:
    """Run with --json, and hold the document to the schema."""

    def run_json(*arguments: str | Path) -> Ran:
        ran = run_here(capsys, *arguments, "--json")
        VALIDATOR.validate(ran.document)
        return ran

    return run_json


def walk(item: Any) -> Iterator[dict[str, Any]]:
    """Yield every object of a document."""
    if isinstance(item, dict):
        yield item
        for value in item.values():
            yield from walk(value)
    elif isinstance(item, list):
        for value in item:
            yield from walk(value)


def quantities(document: dict[str, Any]) -> list[dict[str, Any]]:
    return [item for item in walk(document) if {"value", "unit", "u"} <= item.keys()]


def test_look_prints_what_it_made_and_no_more(run: Run, good: Path) -> None:
    document = run("look", good).document
    assert document.keys() >= DOCUMENT
    assert (document["schema"], document["command"]) == ("benchtool/1", "look")
    assert "verdict" not in document
    result = document["results"][0]
    assert result.keys() >= LOOKED
    assert not {"timing", "circuit", "checks", "verdict"} & result.keys()
    assert result["trace"].keys() >= TRACE
    assert {"low", "high", "mid_v"} <= result["levels"].keys()


def test_look_numbers_the_sources_of_several_files(run: Run, tmp_path: Path, good: Path) -> None:
    other = write_square(tmp_path / "other.csv", seed=9)
    document = run("look", good, other).document
    assert [result["source"] for result in document["results"]] == [0, 1]
    assert [source["name"] for source in document["sources"]] == [str(good), str(other)]
    assert "source" not in run("look", good).document["results"][0]


def test_the_source_says_how_it_was_read(run: Run, good: Path) -> None:
    source = run("look", good).document["sources"][0]
    assert source.keys() >= SOURCE
    assert source["role"] == "main"
    assert source["format"] == "text"
    assert source["structure"]["delimiter"] == ","
    assert source["structure"]["decimal"] == "."
    assert source["structure"]["time_unit"] == "s"


def test_measure_gives_timing_jitter_and_stability(run: Run, good: Path) -> None:
    document = run("measure", good).document
    result = document["results"][0]
    assert result.keys() >= MEASURED
    assert not {"circuit", "checks", "verdict"} & result.keys()
    assert result["stage"] is None
    assert result["timing"].keys() >= TIMING
    assert result["jitter"].keys() >= JITTER
    assert result["stability"][0].keys() >= STABILITY
    assert result["intervals"].keys() >= {"high", "low", "period", "dropped"}
    assert {"reason": "cut at start", "count": 1} in result["intervals"]["dropped"]
    for name, unit in UNITS.items():
        if result["timing"][name] is not None:
            assert result["timing"][name].keys() >= QUANTITY
            assert result["timing"][name]["unit"] == unit


def test_the_trace_is_described_in_plain_numbers(run: Run, good: Path) -> None:
    trace = run("measure", good).document["results"][0]["trace"]
    assert trace["samples"] == 3000
    assert trace["sample_interval_s"] == pytest.approx(0.05, rel=1e-9)
    assert trace["duration_s"] == pytest.approx(150.0, rel=1e-9)  # N·dt
    assert (trace["channel"], trace["role"], trace["kind"]) == ("OUT", "output", "waveform")
    assert (trace["tick_s"], trace["start_s"], trace["gaps"]) == (None, 0.0, [])


def test_transitions_have_no_samples_and_no_levels(run: Run, tmp_path: Path) -> None:
    rows = [f"{3.0 + i * 2.5:.3f},{(i + 1) % 2}" for i in range(21)]
    path = tmp_path / "list.csv"
    path.write_text("\n".join(["time (s),state", "0.000,0", *rows]))
    result = run("measure", path).document["results"][0]
    assert result["levels"] is None
    assert result["trace"]["kind"] == "logic"
    assert result["trace"]["samples"] is None
    assert result["trace"]["sample_interval_s"] is None
    assert result["trace"]["tick_s"] > 0


def test_sampled_logic_keeps_its_interval_as_tick(run: Run, tmp_path: Path) -> None:
    rows = [f"{i * 0.1:.1f},{int(i % 50 < 20)}" for i in range(600)]
    path = tmp_path / "states.csv"
    path.write_text("\n".join(["Time (s),OUT", *rows]))
    trace = run("measure", path).document["results"][0]["trace"]
    assert trace["kind"] == "logic"
    assert trace["samples"] == 600
    assert trace["tick_s"] == trace["sample_interval_s"] == pytest.approx(0.1)


def test_solve_gives_products_and_parts_under_assumptions(
    run: Run, good: Path, design: Path
) -> None:
    result = run("solve", good, "--design", design).document["results"][0]
    circuit = result["circuit"]
    assert circuit.keys() >= CIRCUIT
    assert circuit["topology"] == "astable"
    assert circuit["effective"].keys() >= {"charge", "discharge"}
    assert all(part.keys() >= PART for part in circuit["parts"])
    assert all(part["assumes"] for part in circuit["parts"])
    capacitor = next(part for part in circuit["parts"] if part["ref"] == "C")
    assert capacitor["nominal"] == 47e-6
    assert capacitor["estimate"]["unit"] == "F"
    assert "checks" not in result


def test_solve_from_figures_has_no_source_and_no_trace(run: Run) -> None:
    document = run("solve", "--topology", "astable", "--high", "14.01s", "--low", "10.75s").document
    assert document["sources"] == []
    assert "trace" not in document["results"][0]


def test_judge_gives_checks_verdict_and_rule(run: Run, good: Path, design: Path) -> None:
    document = run("judge", good, "--design", design).document
    assert document["verdict"] == "pass"
    assert document["rule"] == {"name": "guarded", "guard": 1.0, "coverage": 0.95}
    result = document["results"][0]
    assert {*MEASURED, "circuit", "checks", "verdict"} <= result.keys()
    assert (result["stage"], result["verdict"]) == ("spacing", "pass")
    assert all(check.keys() >= CHECK for check in result["checks"])
    checks = {check["quantity"]: check for check in result["checks"]}
    assert checks.keys() == {"t_high", "t_low", "duty", "period"}
    assert checks["period"]["source"] == "drawing GH-MV-07 sheet 4"
    assert checks["t_high"]["source"] == "derived: worst case"
    assert (checks["period"]["lower"], checks["period"]["upper"]) == (22.0, 28.0)


def test_the_guard_band_is_U_inside_each_limit(run: Run, good: Path, design: Path) -> None:
    for check in run("judge", good, "--design", design).document["results"][0]["checks"]:
        U = check["measured"]["U"]
        # 1e-9 of the limit: two ways to the same product
        near = pytest.approx
        assert check["accept_lower"] == near(check["lower"] + U, abs=1e-9 * check["lower"])
        assert check["accept_upper"] == near(check["upper"] - U, abs=1e-9 * check["upper"])


def test_U_is_k_times_u_in_every_quantity(run: Run, good: Path, design: Path) -> None:
    found = quantities(run("judge", good, "--design", design).document)
    assert len(found) > 15
    for item in found:
        assert item.keys() >= QUANTITY
        assert item["U"] == pytest.approx(item["k"] * item["u"], rel=1e-12)
        assert item["n"] >= 1


def test_infinite_dof_is_null_with_k_1_960(run: Run) -> None:
    timing = run("solve", "--topology", "astable", "--high", "14.01s", "--low", "10.75s")
    t_high = timing.document["results"][0]["timing"]["t_high"]
    assert t_high["dof"] is None
    assert t_high["k"] == pytest.approx(1.959964, abs=5e-7)  # the normal 97.5 % point, 6 decimals


def test_few_periods_have_finite_dof_and_the_k_of_student(run: Run, good: Path) -> None:
    period = run("measure", good).document["results"][0]["timing"]["period"]
    assert period["n"] == 5
    # JCGM 100:2008, table G.2, 95 %: t for whole degrees of freedom; the digits printed there
    t = {2: 4.30, 3: 3.18, 4: 2.78, 5: 2.57, 6: 2.45, 7: 2.36, 8: 2.31, 9: 2.26, 10: 2.23}
    assert period["k"] == pytest.approx(t[math.floor(period["dof"])], abs=0.006)


def test_a_bound_has_no_value(run: Run, tmp_path: Path, design: Path) -> None:
    slow = write_square(tmp_path / "slow.csv", t_high_s=200.0, t_low_s=150.0)
    ran = run("judge", slow, "--design", design)
    checks = {item["quantity"]: item for item in ran.document["results"][0]["checks"]}
    measured = checks["t_high"]["measured"]
    assert measured.keys() == {"value", "at_least", "unit"}
    assert measured["value"] is None
    assert measured["at_least"] == pytest.approx(147.0, abs=0.06)  # 150 s less 3 s, one sample
    assert checks["t_high"]["p_conform"] is None


def test_a_dead_board_has_a_frequency_of_at_most(run: Run, tmp_path: Path, design: Path) -> None:
    design.write_text(DESIGN.replace('"duty"]', '"frequency"]'))
    stuck = write_flat(tmp_path / "stuck.csv", 12.0)  # 75 s
    result = run("judge", stuck, "--design", design).document["results"][0]
    measured = {item["quantity"]: item["measured"] for item in result["checks"]}["frequency"]
    assert measured.keys() == {"value", "at_most", "unit"}
    assert measured["at_most"] == pytest.approx(1 / 75, rel=2e-3)  # the record, to a sample
    assert result["findings"][0].keys() >= {"code", "text", "may_be"}


def test_what_cannot_be_had_is_null_and_never_nan(run: Run, good: Path) -> None:
    ran = run("measure", good)
    timing = ran.document["results"][0]["timing"]
    assert timing["first_high"] is None
    assert timing["delay"] is None
    assert "NaN" not in ran.out
    assert "Infinity" not in ran.out


def test_numbers_are_not_rounded(run: Run, good: Path) -> None:
    timing = run("measure", good).document["results"][0]["timing"]
    period, frequency = timing["period"]["value"], timing["frequency"]["value"]
    assert period * frequency == pytest.approx(1, abs=1e-12)
    assert timing["t_high"]["U"] != round(timing["t_high"]["U"], 6)


def test_baseline_is_a_second_source(run: Run, tmp_path: Path, good: Path) -> None:
    before = write_square(tmp_path / "before.csv", seed=8)
    document = run("measure", good, "--baseline", before).document
    assert [source["role"] for source in document["sources"]] == ["main", "baseline"]
    change = document["results"][0]["changes"][0]
    assert change.keys() >= {"quantity", "before", "change", "significant"}
    assert document["results"][0]["source"] == 0


def test_budgets_come_with_their_option_alone(run: Run, good: Path) -> None:
    assert "budgets" not in run("measure", good).document["results"][0]
    result = run("measure", good, "--budget").document["results"][0]
    parts = result["budgets"]["period"]
    total = math.sqrt(sum(part["u"] ** 2 for part in parts))
    assert total == pytest.approx(result["timing"]["period"]["u"], rel=1e-9)


def test_several_stages_give_a_result_each_and_the_worst_verdict(
    run: Run, tmp_path: Path, design: Path
) -> None:
    second = DESIGN.partition("[stage.spacing]")[2].replace("stage.spacing", "stage.other")
    text = DESIGN + "[stage.other]" + second.replace('"OUT"', '"OUT2"')
    design.write_text(text)
    times_s = np.arange(3000) * 0.05
    wave = {name: np.where((times_s + 5) % 24.76 < high, 12.0, 0.0) for name, high in HIGHS.items()}
    rows = np.column_stack([times_s, *wave.values()])
    path = tmp_path / "two.csv"
    np.savetxt(path, rows, delimiter=",", header="Time (s),OUT (V),OUT2 (V)", comments="")
    document = run("judge", path, "--design", design).document
    assert [(item["stage"], item["verdict"]) for item in document["results"]] == [
        ("spacing", "pass"),
        ("other", "fail"),
    ]
    assert document["verdict"] == "fail"


HIGHS = {"OUT": 14.0, "OUT2": 8.0}


@pytest.mark.parametrize(
    "arguments",
    [
        ["design", "check", "DESIGN"],
        ["design", "show", "DESIGN"],
        ["design", "limits", "DESIGN", "--expect", "0.1%"],
        ["design", "schema"],
        [
            *("design", "new", "--name", "Mist", "--topology", "astable", "--supply", "12 V 5%"),
            *("--RA", "100k 1%", "--RB", "330k 1%", "--C", "47u 10%"),
        ],
        ["parts", "marking", "103", "4n7K"],
        ["explain", "guard", "band"],
        ["explain"],
        ["simulate", "DESIGN", "--rate", "20Hz", "--periods", "3", "-o", "NEW"],
    ],
    ids=lambda words: " ".join(words[:2]),
)
def test_verbs_that_measure_nothing_print_their_rows(
    run: Run, tmp_path: Path, design: Path, arguments: list[str]
) -> None:
    places = {"DESIGN": str(design), "NEW": str(tmp_path / "made.csv")}
    ran = run(*(places.get(word, word) for word in arguments))
    assert ran.code == 0
    assert ran.err == ""
    assert ran.document["rows"] or arguments[1] == "check"  # a sound design: nothing to list
    assert arguments[: 2 if arguments[0] in ("design", "parts") else 1] == (
        ran.document["command"].split()
    )


@pytest.mark.parametrize(("ok", "code"), [(True, 0), (False, 70)])
def test_a_self_test_that_does_not_hold_is_no_bad_board(
    run: Run, monkeypatch: pytest.MonkeyPatch, ok: bool, code: int
) -> None:
    check = SelfCheck(name="coverage", found=0.94, limit=0.93, ok=ok, text="94 of 100")
    monkeypatch.setattr("benchtool.selftest.run_selftest", lambda n_captures: (check,) * n_captures)
    ran = run("selftest", "--captures", "100")
    assert ran.code == code
    assert len(ran.document["rows"]) == 100
    assert ran.document["rows"][0]["ok"] is ok


def test_limits_say_how_much_room_there_is(run: Run, design: Path) -> None:
    rows = run("design", "limits", design, "--expect", "0.1%").document["rows"]
    period = next(row for row in rows if row["quantity"] == "period")
    assert period["used"] == "given"
    assert period["derived"].keys() == {"worst-case", "rss", "monte-carlo"}
    # half of 6 s against 0.1 % of the nominal period
    assert period["room"] == pytest.approx(3 / (1e-3 * period["nominal"]), rel=1e-9)


@pytest.mark.parametrize(
    ("arguments", "command", "code"),
    [
        (["look", "none.csv"], "look", "no-such-file"),
        (["judge", "none.csv"], "judge", "usage"),
        (["design", "check", "none.toml"], "design check", "no-such-file"),
        (["parts", "marking", "zzz"], "parts marking", "unit"),
        (["explain", "drizzle"], "explain", "no-such-term"),
        (["selftest", "--captures", "1"], "selftest", "usage"),
        (["simulate", "none.toml", "--rate", "1kHz"], "simulate", "usage"),
        (["mesure"], None, "usage"),
    ],
)
def test_an_error_is_one_document_on_stdout(
    run: Run, arguments: list[str], command: str | None, code: str
) -> None:
    ran = run(*arguments)
    assert ran.code == 2
    assert ran.err == ""
    assert ran.document.keys() >= {"schema", "command", "error"}
    assert ran.document["command"] == command
    error = ran.document["error"]
    assert error.keys() >= {"code", "message", "hint", "faults"}
    assert error["code"] == code
    assert error["faults"] == []


def test_design_faults_are_listed(run: Run, good: Path, design: Path) -> None:
    design.write_text(DESIGN.replace("supply =", "suply ="))
    fault = run("judge", good, "--design", design).document["error"]["faults"][0]
    assert fault.keys() >= {"file", "line", "key", "message", "near"}
    assert fault["near"] == "supply"
    assert fault["file"] == str(design)


def test_source_date_epoch_fixes_made_at(
    run: Run, good: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1930187520")
    assert run("look", good).document["made_at"] == "2031-03-02T03:12:00Z"
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "tomorrow")
    ran = run("look", good)
    assert ran.code == 2
    assert "SOURCE_DATE_EPOCH" in ran.document["error"]["message"]


def test_two_runs_give_the_same_bytes(
    run: Run, good: Path, design: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1930187520")
    arguments = ("judge", good, "--design", design)
    apart = run_apart(*arguments, "--json", environment={"PYTHONHASHSEED": "7"})
    assert (apart.code, apart.err) == (0, "")
    assert apart.out == run(*arguments).out


def test_a_document_needs_no_more_than_ascii(run: Run, good: Path) -> None:
    ran = run("measure", good, "--budget")  # notes of a budget hold √
    assert "√" in ran.document["results"][0]["budgets"]["period"][0]["note"]
    assert ran.out.isascii()


def test_a_name_that_is_no_text_is_still_a_document(run: Run, tmp_path: Path) -> None:
    name = tmp_path / b"mist\xff.csv".decode("utf-8", "surrogateescape")
    assert run("look", write_square(name)).code == 0
    VALIDATOR.validate(run("look", f"{name}.none").document)


@pytest.mark.parametrize(
    "given",
    [
        ("good_board.csv", "--design", "mist_valve.toml"),
        ("leaky_c.csv", "--design", "mist_valve.toml", "--reading", "control-pin=8V"),
        ("wrong_rb.txt", "--design", "mist_valve.toml", "--good-board", "good_board.csv"),
        ("stuck_high.csv", "--design", "mist_valve.toml", "--reading", "node-level=0V"),
        ("node_probed.csv", "--design", "mist_valve_node.toml"),
        ("power_up.csv", "--design", "mist_valve_power_up.toml", "--reading", "RB=100k"),
        ("one_shot.csv", "--design", "mist_pulse.toml"),
        ("rippling_supply.csv.gz", "--design", "mist_heartbeat.toml"),
        ("good_board.csv", "--topology", "astable"),
        ("good_board.csv", "--topology", "astable", "--RA", "100k", "--RB", "330k", "--C", "47u"),
    ],
)
def test_every_diagnosis_keeps_to_the_schema_and_its_chances_sum_to_1(
    given: tuple[str, ...], run: Run
) -> None:
    samples = Path(__file__).parents[2] / "sample_captures"
    words = (samples / word if "." in word and "=" not in word else word for word in given)
    document = run("diagnose", *words).document
    for result in document["results"]:
        chances = [item["probability"] for item in result.get("suspects", [])]
        assert not chances or math.fsum(chances) == pytest.approx(1, abs=1e-9)
        assert sorted(chances, reverse=True) == chances
