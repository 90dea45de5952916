"""The whole way as one call, and what it shares with the command line."""

from __future__ import annotations

import json
import math
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from captures import (
    C_F,
    DESIGN,
    HEAD,
    RB_OHM,
    T_HIGH_S,
    T_LOW_S,
    sample_times,
    square_edges,
    square_v,
    write_columns,
    write_flat,
    write_square,
)

import benchtool
from benchtool import pipeline
from benchtool.cli.main import main
from benchtool.designs import load_design
from benchtool.errors import InputError, MeasurementError
from benchtool.model.capture import ReadOptions
from benchtool.model.design import Probe
from benchtool.model.options import MeasureOptions
from benchtool.model.quantity import Bound, Measured
from benchtool.model.result import Analysis
from benchtool.report.document import analysis_document
from benchtool.uncertainty import expanded


def period_of(analysis: Analysis) -> Measured:
    timing = analysis.results[0].timing
    assert timing is not None
    assert isinstance(timing.period, Measured)
    return timing.period


def test_analyse_is_offered_at_the_top() -> None:
    assert benchtool.analyse is pipeline.analyse
    with pytest.raises(AttributeError, match="analyze"):
        benchtool.analyze  # type: ignore[attr-defined]  # noqa: B018 - the look-up is the test


HEAVY = {"pandas", "scipy", "rich", "matplotlib", "jinja2"}


@pytest.mark.parametrize(
    ("verb", "forbidden"), [("measure", {*HEAVY, "pydantic"}), ("judge", HEAVY)]
)
def test_a_run_loads_no_heavy_library(
    verb: str, forbidden: set[str], good: Path, design: Path
) -> None:
    more = ["--design", str(design)] if verb == "judge" else []
    code = (
        "import sys; from benchtool.cli.main import main; "
        f"assert main({[verb, str(good), '--json', *more]!r}) == 0; "
        f"print(*{forbidden!r} & sys.modules.keys(), file=sys.stderr)"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert run.stderr.split() == []


@pytest.mark.parametrize("verb", ["look", "measure", "solve", "judge"])
def test_the_command_line_prints_what_the_call_returns(
    verb: str,
    good: Path,
    design: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1930187520")
    calls = {
        "look": lambda: pipeline.look([str(good)]),
        "measure": lambda: pipeline.measure(str(good)),
        "solve": lambda: pipeline.solve(str(good), str(design)),
        "judge": lambda: pipeline.analyse(str(good), str(design)),
    }
    more = ["--design", str(design)] if verb in ("solve", "judge") else []
    main([verb, str(good), *more, "--json"])
    printed = json.loads(capsys.readouterr().out)
    version, made_at = benchtool.__version__, "2031-03-02T03:12:00Z"
    document = analysis_document(calls[verb](), version=version, made_at=made_at)
    assert printed == json.loads(json.dumps(document))


def test_the_truth_lies_within_U(good: Path, design: Path) -> None:
    result = pipeline.analyse(good, design).results[0]
    assert result.timing is not None
    truths = {
        "t_high": T_HIGH_S,
        "t_low": T_LOW_S,
        "period": T_HIGH_S + T_LOW_S,
        "frequency": 1 / (T_HIGH_S + T_LOW_S),
        "duty": T_HIGH_S / (T_HIGH_S + T_LOW_S),
    }
    for name, truth in truths.items():
        measured = getattr(result.timing, name)
        assert abs(measured.value - truth) <= expanded(measured), name
        assert expanded(measured) < 5e-3 * truth, name


def test_a_path_a_text_and_a_loaded_design_are_alike(good: Path, design: Path) -> None:
    by_path = pipeline.analyse(good, design)
    loaded = pipeline.analyse(str(good), load_design(design))
    assert by_path.verdict == loaded.verdict == "pass"
    assert by_path.results[0].checks == loaded.results[0].checks


def test_a_bad_board_is_a_result_and_no_error(tmp_path: Path, design: Path) -> None:
    analysis = pipeline.analyse(write_flat(tmp_path / "stuck.csv", 12.0), design)
    assert analysis.verdict == "fail"
    with pytest.raises(MeasurementError, match="flat"):
        pipeline.measure(tmp_path / "stuck.csv")


def test_a_missing_file_is_an_error(tmp_path: Path, design: Path) -> None:
    with pytest.raises(InputError):
        pipeline.analyse(tmp_path / "none.csv", design)


def test_an_option_wins_over_the_design_and_the_design_over_the_default(
    good: Path, design: Path
) -> None:
    default = pipeline.analyse(good, design)
    design.write_text(DESIGN + '\n[instrument]\ntimebase = "200 ppm"\n')
    stated = pipeline.analyse(good, design)
    told = pipeline.analyse(good, design, options=MeasureOptions(timebase_rel=1e-3))
    found = [(item.timebase_rel, item.timebase_from) for item in (default, stated, told)]
    assert found == [
        (50e-6, "default"),
        (pytest.approx(200e-6), "[instrument] of the design"),
        (1e-3, "option --timebase"),
    ]
    assert period_of(told).u > period_of(stated).u > period_of(default).u


def test_the_temperature_reaches_the_circuit(good: Path, design: Path) -> None:
    design.write_text(
        DESIGN.replace('"electrolytic"', '"electrolytic", tempco = "1000 ppm/K"').replace(
            "assembly", 'temperature = "25 degC"\nassembly'
        )
    )

    def capacitor(options: MeasureOptions) -> float:
        solution = pipeline.solve(good, design, options=options).results[0].solution
        assert solution is not None
        found = next(part for part in solution.parts if part.ref == "C")
        assert found.estimate is not None
        return found.estimate.value

    plain = capacitor(pipeline.DEFAULTS)
    # part values refer to 25 °C: at 35 °C C is 1 % up, so its value at 25 °C is 1 % less
    assert capacitor(MeasureOptions(temperature_c=35.0)) == pytest.approx(plain / 1.01, rel=2e-3)


def test_the_probe_reaches_the_circuit(good: Path, design: Path) -> None:
    def tau_s(options: MeasureOptions) -> float:
        solution = pipeline.solve(good, design, options=options).results[0].solution
        assert solution is not None
        assert solution.tau_charge is not None
        return solution.tau_charge.value

    loaded = tau_s(MeasureOptions(probe=Probe(r_ohm=10e6, at="capacitor")))
    # dln t_high = 1.164·(RA+RB)/Rp = 5.0 %: the parts alone are so much smaller
    assert loaded == pytest.approx(tau_s(pipeline.DEFAULTS) * (1 - 0.050), rel=1e-2)


def test_the_reader_is_told_what_the_user_knows(tmp_path: Path) -> None:
    path = tmp_path / "volts.csv"
    times_s = sample_times()
    volts = square_v(times_s, square_edges(8))
    path.write_text("\n".join(f"{v:g}" for v in volts))
    options = MeasureOptions(read=ReadOptions(interval_s=0.05))
    assert period_of(pipeline.measure(path, options=options)).value == pytest.approx(
        24.76, abs=0.03
    )


def test_look_takes_each_trace_of_each_file(tmp_path: Path, good: Path) -> None:
    times_s = sample_times()
    wave = square_v(times_s, square_edges(8))
    two = write_columns(tmp_path / "two.csv", times_s, {"OUT": wave, "VCC": 0 * times_s + 12})
    analysis = pipeline.look([good, two])
    found = [
        (item.source, item.trace.channel, item.trace.role)
        for item in analysis.results
        if item.trace
    ]
    assert found == [(0, "OUT", "output"), (1, "OUT", "output"), (1, "VCC", "supply")]


def test_solve_needs_no_design(good: Path) -> None:
    analysis = pipeline.solve_topology(good, "astable", known={"RB": RB_OHM}, supply_v=12.0)
    solution = analysis.results[0].solution
    assert solution is not None
    capacitor = next(part for part in solution.parts if part.ref == "C")
    assert capacitor.estimate is not None
    assert abs(capacitor.estimate.value - C_F) <= expanded(capacitor.estimate)


POWER_ON = (
    HEAD
    + """
[stage.hold]
topology = "power-on"
channel = "HOLD"
R = "100k 1%"
C = "47u 10%"
ic = "cmos"
limits = { derive = "worst-case", quantities = ["delay"] }
"""
)
DELAY_S = 100e3 * C_F * math.log(3)  # 5.164 s


def held(tmp_path: Path, *, with_supply: bool) -> tuple[Path, Path]:
    """Return the capture of a board that releases a valve a delay after power-up, and its design.

    Its output is high from power-up, at 2 s, for the delay.
    """
    design = tmp_path / "delay.toml"
    design.write_text(POWER_ON)
    times_s = sample_times(400)
    columns = {"HOLD": square_v(times_s, np.array([2.05, 2.0 + DELAY_S]))}
    if with_supply:
        columns["VCC"] = square_v(times_s, np.array([2.0]))
    return write_columns(tmp_path / "hold.csv", times_s, columns), design


@pytest.mark.parametrize("with_supply", [False, True])
def test_a_delay_counts_from_the_supply_where_it_is_seen(tmp_path: Path, with_supply: bool) -> None:
    analysis = pipeline.analyse(*held(tmp_path, with_supply=with_supply))
    result = analysis.results[0]
    assert analysis.verdict == "pass"
    assert result.timing is not None
    assert isinstance(result.timing.delay, Measured)
    assert result.timing.delay.value == pytest.approx(DELAY_S, abs=0.11)  # two samples
    codes = {notice.code for notice in result.warnings}
    assert ("assumed-delay-from-output" in codes) is not with_supply


@pytest.mark.parametrize("held_v", [0.0, 12.0])
def test_a_power_on_output_that_never_answers_its_supply_fails(
    tmp_path: Path, held_v: float
) -> None:
    _, design = held(tmp_path, with_supply=True)
    times_s = sample_times(400)
    supply_v = square_v(times_s, np.array([2.0]))
    columns = {"HOLD": supply_v * held_v / 12.0, "VCC": supply_v}
    dead = write_columns(tmp_path / "dead.csv", times_s, columns)
    analysis = pipeline.analyse(dead, design)
    bound = analysis.results[0].checks[0].measured
    assert analysis.verdict == "fail"
    assert isinstance(bound, Bound)
    assert bound.at_least == pytest.approx(times_s[-1] - 2.0, abs=0.05)  # one sample


def test_solving_a_power_on_record_needs_no_whole_period(tmp_path: Path) -> None:
    solution = pipeline.solve(*held(tmp_path, with_supply=False)).results[0].solution
    assert solution is not None
    assert solution.tau_charge is not None
    assert solution.tau_charge.value == pytest.approx(4.7, abs=0.11 / math.log(3))


def test_a_first_high_is_kept_apart(tmp_path: Path) -> None:
    times_s = sample_times(3400)
    first_fall_s = 5.0 + T_HIGH_S * math.log(3) / math.log(2)
    steady_s = square_edges(6, first_s=first_fall_s + T_LOW_S)
    edges_s = np.concatenate([[5.0, first_fall_s], steady_s])
    path = write_columns(tmp_path / "up.csv", times_s, {"OUT": square_v(times_s, edges_s)})
    timing = pipeline.measure(path).results[0].timing
    assert timing is not None
    assert timing.first_high is not None
    assert timing.first_high.value == pytest.approx(22.203, abs=0.06)  # a sample
    assert isinstance(timing.t_high, Measured)
    assert timing.t_high.value == pytest.approx(T_HIGH_S, abs=expanded(timing.t_high))


def test_write_square_means_what_it_says(tmp_path: Path) -> None:
    """The generator itself: times of the first two edges, to a sample."""
    path = write_square(tmp_path / "a.csv", jitter_s=0.0)
    rows = [tuple(map(float, row.split(","))) for row in path.read_text().splitlines()[1:]]
    changes = [at for (at, v), (_, before) in zip(rows[1:], rows, strict=False) if v != before]
    assert changes[:2] == [pytest.approx(3.0), pytest.approx(3.0 + T_HIGH_S, abs=0.051)]


def test_the_pulse_of_a_one_shot_may_go_low(tmp_path: Path) -> None:
    """Active low: the 2 s the output is low are the pulse, not the 5 s it rests high."""
    design = tmp_path / "pulse.toml"
    design.write_text(
        HEAD + '[stage.pulse]\ntopology = "one-shot"\nactive = "low"\nR = "39k"\nC = "47u"\n'
        'ic = "cmos"\nlimits = { t_high = { lower = "1.9 s", upper = "2.1 s" } }\n',
        encoding="utf-8",
    )
    times_s = np.arange(2500) * 0.01
    volts = square_v(times_s, np.array([0.0, 3.0, 5.0, 10.0, 12.0, 17.0, 19.0]))
    path = write_columns(tmp_path / "pulse.csv", times_s, {"OUT": volts})
    result = pipeline.analyse(path, design).results[0]
    assert result.verdict == "pass"
    assert isinstance(result.timing.t_high, Measured)
    assert result.timing.t_high.value == pytest.approx(2.0, abs=0.011)  # the sampling interval


def test_the_first_high_after_the_supply_needs_no_other_to_compare(tmp_path: Path) -> None:
    times_s = np.arange(0, 42, 0.01)
    up = square_v(times_s, np.array([2.0]))
    out = square_v(times_s, np.array([2.0, 24.2, 34.95]))
    columns = {"OUT": out, "VCC": up}
    path = write_columns(tmp_path / "up.csv", times_s, columns)
    options = MeasureOptions(read=ReadOptions(channel="OUT"))
    timing = pipeline.measure(path, options=options).results[0].timing
    assert timing is not None
    assert isinstance(timing.first_high, Measured)
    assert timing.first_high.value == pytest.approx(22.2, abs=0.02)  # two samples
    assert isinstance(timing.t_high, Bound)


def test_look_lists_64_traces_and_counts_the_rest(tmp_path: Path) -> None:
    times_s = np.arange(100) * 0.01
    wave = square_v(times_s, np.arange(0.0, 1.0, 0.1))
    path = write_columns(tmp_path / "wide.csv", times_s, {f"D{i}": wave for i in range(70)})
    analysis = pipeline.look([path])
    assert len(analysis.results) == 64
    notices = [item for item in analysis.warnings if item.code == "traces-not-listed"]
    assert len(notices) == 1
    assert "6 more traces" in notices[0].text


def test_a_level_for_the_output_is_not_asked_of_its_supply(tmp_path: Path) -> None:
    """6 V lies between the states of the output and outside those of a rippling supply."""
    times_s = np.arange(0, 60, 0.01)
    out = square_v(times_s, np.arange(1.0, 60.0, 5.0))
    supply = 12 + 0.3 * np.sign(np.sin(2 * np.pi * 3.1 * times_s))
    path = write_columns(tmp_path / "both.csv", times_s, {"OUT": out, "VCC": supply})
    options = MeasureOptions(level_v=6.0, read=ReadOptions(channel="OUT"))
    timing = pipeline.measure(path, options=options).results[0].timing
    assert timing is not None
    assert isinstance(timing.period, Measured)
    assert timing.period.value == pytest.approx(10.0, abs=0.01)  # the sampling interval
