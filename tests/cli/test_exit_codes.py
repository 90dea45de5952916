"""Every way a run can end, and its exit code: 1 is a bad board and nothing else."""

from __future__ import annotations

import errno
import os
import subprocess
import sys
from pathlib import Path

import click
import numpy as np
import pytest
from captures import DESIGN, HEAD, PARTS, sample_times, write_columns, write_flat, write_square
from running import run_apart, run_here

from benchtool.cli.exits import exit_code
from benchtool.errors import BenchtoolError, InputError, UnitError

Capsys = pytest.CaptureFixture[str]


def test_0_a_good_board_passes(capsys: Capsys, good: Path, design: Path) -> None:
    assert run_here(capsys, "judge", good, "--design", design).code == 0


@pytest.mark.parametrize("verb", ["look", "measure"])
def test_0_a_verb_that_judges_nothing(capsys: Capsys, good: Path, verb: str) -> None:
    assert run_here(capsys, verb, good).code == 0


def test_1_a_board_outside_its_limits(capsys: Capsys, tmp_path: Path, design: Path) -> None:
    fast = write_square(tmp_path / "fast.csv", t_high_s=11.2, t_low_s=8.6)
    assert run_here(capsys, "judge", fast, "--design", design).code == 1


def test_1_through_a_process_of_its_own(tmp_path: Path, design: Path) -> None:
    fast = write_square(tmp_path / "fast.csv", t_high_s=11.2, t_low_s=8.6)
    ran = run_apart("judge", fast, "--design", design)
    assert ran.code == 1
    assert "FAIL" in ran.out


@pytest.mark.parametrize(
    ("arguments", "code", "says"),
    [
        (["judge", "GOOD"], "usage", "--design"),
        (["measure"], "usage", "FILE"),
        (["measure", "GOOD", "--nonsense"], "usage", "--nonsense"),
        (["measure", "GOOD", "--rate", "1kHz", "--interval", "1ms"], "usage", "--rate"),
        (["measure", "GOOD", "--level", "high"], "unit", "--level"),
        (["measure", "GOOD", "--timebase", "60%"], "usage", "--timebase"),
        (["measure", "GOOD", "--probe", "10M"], "usage", "--probe"),
        (["measure", "GOOD", "--active", "up"], "usage", "--active"),
        (["measure", "NONE"], "no-such-file", "does not exist"),
        (["measure", "FOLDER"], "is-directory", "directory"),
        (["judge", "GOOD", "--design", "NONE"], "no-such-file", "no file"),
        (["measure", "GOOD", "--report", "page.pdf"], "report-suffix", ".pdf"),
        (["parts", "marking", "zzz"], "unit", "zzz"),
        (["explain", "drizzle"], "no-such-term", "drizzle"),
    ],
)
def test_2_usage_and_files(
    capsys: Capsys, tmp_path: Path, good: Path, arguments: list[str], code: str, says: str
) -> None:
    places = {"GOOD": str(good), "NONE": str(tmp_path / "none.csv"), "FOLDER": str(tmp_path)}
    ran = run_here(capsys, *(places.get(word, word) for word in arguments))
    assert ran.code == 2
    assert ran.out == ""
    assert says in ran.err
    assert f"benchtool explain {code}" in ran.err


def test_2_an_unknown_verb_names_the_nearest(capsys: Capsys) -> None:
    ran = run_here(capsys, "mesure", "x.csv")
    assert ran.code == 2
    assert "Did you mean: benchtool measure?" in ran.err


def test_2_a_file_in_place_of_a_verb_hints_look(capsys: Capsys, tmp_path: Path) -> None:
    named = write_square(tmp_path / "mist 07.csv")
    ran = run_here(capsys, named)
    assert ran.code == 2
    assert f"Try: benchtool look '{named}'" in ran.err


def test_2_no_verb_at_all_prints_the_help(capsys: Capsys) -> None:
    ran = run_here(capsys)
    assert ran.code == 2
    assert "Saved captures:" in ran.out


def test_2_no_permission(capsys: Capsys, good: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(path: Path, *_: object, **__: object) -> None:
        raise PermissionError(errno.EACCES, "Permission denied", str(path))

    monkeypatch.setattr(Path, "open", refuse)
    ran = run_here(capsys, "measure", good)
    assert ran.code == 2
    assert good.name in ran.err


def test_2_a_file_that_says_too_little_names_the_option(capsys: Capsys, tmp_path: Path) -> None:
    volts = np.where(np.arange(400) % 40 < 20, 12.0, 0.0)
    path = tmp_path / "volts.csv"
    np.savetxt(path, volts, header="OUT (V)", comments="", fmt="%.1f")
    ran = run_here(capsys, "measure", path)
    assert ran.code == 2
    assert "--interval" in ran.err or "--rate" in ran.err
    assert run_here(capsys, "measure", path, "--interval", "50ms").code == 0


def test_2_noise_that_is_no_capture(capsys: Capsys, tmp_path: Path) -> None:
    path = tmp_path / "noise.csv"
    path.write_bytes(np.random.default_rng(3).bytes(4000))
    assert run_here(capsys, "look", path).code == 2


def test_3_too_near_a_limit_to_tell(capsys: Capsys, tmp_path: Path, design: Path) -> None:
    near = write_square(tmp_path / "near.csv", t_high_s=12.45, t_low_s=9.55)  # the limit: 22 s
    ran = run_here(capsys, "judge", near, "--design", design)
    assert ran.code == 3
    assert "UNDECIDED" in ran.out


@pytest.mark.parametrize(
    ("period_s", "verdict"), [(22.01, "conditional-pass"), (21.99, "conditional-fail")]
)
def test_3_conditional_under_the_nonbinary_rule(
    capsys: Capsys, tmp_path: Path, design: Path, period_s: float, verdict: str
) -> None:
    design.write_text(DESIGN + '\n[decision]\nrule = "nonbinary"\n')
    near = write_square(
        tmp_path / "near.csv", t_high_s=0.5658 * period_s, t_low_s=0.4342 * period_s, seed=4
    )
    ran = run_here(capsys, "judge", near, "--design", design, "--json")
    assert ran.document["verdict"] == verdict
    assert ran.code == 3


@pytest.mark.parametrize(
    ("content", "code"),
    [
        (b"", "empty-file"),
        (b"Time (s),OUT (V)\n", None),
        (b"Time (s),OUT (V)\n0,12\n", None),
    ],
    ids=["empty", "header only", "one row"],
)
def test_4_a_file_without_data(
    capsys: Capsys, tmp_path: Path, content: bytes, code: str | None
) -> None:
    path = tmp_path / "bad.csv"
    path.write_bytes(content)
    ran = run_here(capsys, "measure", path, "--json")
    assert ran.code == 4
    assert code in (None, ran.document["error"]["code"])


def test_4_a_flat_line_has_no_timing(capsys: Capsys, tmp_path: Path) -> None:
    ran = run_here(capsys, "measure", write_flat(tmp_path / "flat.csv", 12.0), "--json")
    assert ran.code == 4
    assert ran.document["error"]["code"] == "flat-trace"


def test_4_no_complete_interval_gives_the_bound(capsys: Capsys, tmp_path: Path) -> None:
    short = write_square(tmp_path / "short.csv", n_samples=200)  # 10 s: one edge, at 3 s
    ran = run_here(capsys, "measure", short, "--json")
    assert ran.code == 4
    assert ran.document["error"]["code"] == "no-interval"
    assert "at least 9.95 s" in ran.document["error"]["message"]


def test_4_too_few_samples_a_period(capsys: Capsys, tmp_path: Path) -> None:
    sparse = write_square(tmp_path / "sparse.csv", dt_s=8.0, n_samples=200, jitter_s=0.5)
    ran = run_here(capsys, "measure", sparse, "--json")
    assert ran.code == 4
    assert ran.document["error"]["code"] == "under-sampled"


def test_4_times_that_no_such_circuit_gives(capsys: Capsys) -> None:
    ran = run_here(capsys, "solve", "--topology", "astable", "--high", "8s", "--low", "14s")
    assert ran.code == 4
    assert "no-solution" in ran.err


def test_4_a_design_cannot_judge_an_unusable_trace(
    capsys: Capsys, tmp_path: Path, design: Path
) -> None:
    between = write_flat(tmp_path / "between.csv", 5.0)  # 0.42 of the supply: neither state
    ran = run_here(capsys, "judge", between, "--design", design)
    assert ran.code == 4
    assert "UNUSABLE" in ran.out


def test_6_every_design_fault_with_its_line(capsys: Capsys, good: Path, design: Path) -> None:
    design.write_text(DESIGN.replace('RA = "100k 1%"', 'RA = "100k 1%"\nRD = "1k"\nicc = "x"'))
    ran = run_here(capsys, "judge", good, "--design", design, "--json")
    assert ran.code == 6
    faults = ran.document["error"]["faults"]
    assert [fault["key"].rpartition(".")[2] for fault in faults] == ["RD", "icc"]
    lines = design.read_text().splitlines()
    assert [lines[fault["line"] - 1].partition(" ")[0] for fault in faults] == ["RD", "icc"]
    said = run_here(capsys, "judge", good, "--design", design).err
    assert said.count("line ") == 2
    assert "stage.spacing.icc" in said
    assert "(nearest known key: ic)" in said


def test_6_a_design_without_checks(capsys: Capsys, good: Path, design: Path) -> None:
    design.write_text(f'{HEAD}\n[stage.spacing]\ntopology = "astable"\n{PARTS}')
    assert run_here(capsys, "judge", good, "--design", design).code == 6


def test_6_physics_that_cannot_work(capsys: Capsys, design: Path) -> None:
    design.write_text(DESIGN.replace('leakage = "0.5 uA"', 'leakage = "40 uA"'))
    ran = run_here(capsys, "design", "check", design)
    assert ran.code == 6
    assert "error" in ran.out


@pytest.fixture
def broken(monkeypatch: pytest.MonkeyPatch) -> None:
    """A fault of the program itself."""

    def fail(*_: object, **__: object) -> None:
        raise ZeroDivisionError("inside\nthe program")

    monkeypatch.setattr("benchtool.pipeline.measure", fail)


@pytest.mark.usefixtures("broken")
def test_70_an_internal_fault_is_one_line(
    capsys: Capsys, good: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.delenv("BENCHTOOL_DEBUG", raising=False)
    ran = run_here(capsys, "measure", good)
    assert ran.code == 70
    first, *rest = ran.err.splitlines()
    assert first == "benchtool: internal fault: ZeroDivisionError: inside the program"
    assert "BENCHTOOL_DEBUG=1" in rest[0]
    assert "Traceback" not in ran.err


@pytest.mark.usefixtures("broken")
def test_70_shows_the_traceback_when_asked(
    capsys: Capsys, good: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("BENCHTOOL_DEBUG", "1")
    ran = run_here(capsys, "measure", good)
    assert ran.code == 70
    assert "Traceback (most recent call last)" in ran.err
    assert 'raise ZeroDivisionError("inside' in ran.err


@pytest.mark.usefixtures("broken")
def test_70_is_a_document_with_json(capsys: Capsys, good: Path) -> None:
    ran = run_here(capsys, "measure", good, "--json")
    assert ran.code == 70
    assert ran.document["error"]["code"] == "internal"
    assert ran.err == ""


@pytest.mark.parametrize("raised", [KeyboardInterrupt, click.Abort])
def test_130_interrupted(
    capsys: Capsys, good: Path, monkeypatch: pytest.MonkeyPatch, raised: type[BaseException]
) -> None:
    def interrupt(*_: object, **__: object) -> None:
        raise raised

    monkeypatch.setattr("benchtool.pipeline.measure", interrupt)
    ran = run_here(capsys, "measure", good)
    assert ran.code == 130
    assert "interrupted" in ran.err
    assert ran.out == ""


def run_into_closed_pipe(*arguments: str | Path, stream: str) -> tuple[int, bytes]:
    """Run with a pipe that nobody reads as stdout or stderr; return the code and the other."""
    reader, writer = os.pipe()
    os.close(reader)
    streams = {"stdout": subprocess.PIPE, "stderr": subprocess.PIPE, stream: writer}
    command = [sys.executable, "-m", "benchtool", *map(str, arguments)]
    with subprocess.Popen(command, stdout=streams["stdout"], stderr=streams["stderr"]) as process:
        os.close(writer)
        out, err = process.communicate()
    return process.returncode, (err if stream == "stdout" else out)


@pytest.mark.parametrize("verb", [["look", "GOOD"], ["look", "GOOD", "--json"], ["--help"]])
def test_141_nobody_reads_the_pipe(good: Path, verb: list[str]) -> None:
    words = [str(good) if word == "GOOD" else word for word in verb]
    assert run_into_closed_pipe(*words, stream="stdout") == (141, b"")


def test_141_head_takes_the_first_line() -> None:
    line = f'{sys.executable} -m benchtool explain | head -1; echo "${{PIPESTATUS[0]}}"'
    ran = subprocess.run(["bash", "-c", line], capture_output=True, text=True, check=True)
    assert ran.stdout.split() == ["141"]  # the first line is empty
    assert ran.stderr == ""


def test_a_message_that_nobody_reads_keeps_its_code(tmp_path: Path) -> None:
    assert run_into_closed_pipe("look", tmp_path / "none.csv", stream="stderr") == (2, b"")


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="needs a full device")
@pytest.mark.parametrize("more", [[], ["--json"]])
def test_a_full_disk_is_no_fault_of_the_program(good: Path, more: list[str]) -> None:
    command = [sys.executable, "-m", "benchtool", "look", str(good), *more]
    with Path("/dev/full").open("w") as full:
        ran = subprocess.run(command, stdout=full, stderr=subprocess.PIPE, text=True, check=False)
    assert ran.returncode == 2
    assert "internal" not in ran.stderr


@pytest.mark.skipif(os.name != "posix", reason="needs a shell that closes streams")
def test_a_closed_stdout_is_no_fault(good: Path, design: Path) -> None:
    line = f"exec {sys.executable} -m benchtool judge {good} --design {design} >&-"
    ran = subprocess.run(["bash", "-c", line], capture_output=True, text=True, check=False)
    assert (ran.returncode, ran.stderr) == (0, "")


def test_a_class_below_a_known_error_ends_like_it() -> None:
    class StrangeInputError(InputError):
        pass

    assert exit_code(StrangeInputError("x", hint="y")) == 2
    assert exit_code(UnitError("x", hint="y")) == 2
    assert exit_code(BenchtoolError("x", hint="y")) == 70


def test_several_traces_that_could_be_meant(capsys: Capsys, tmp_path: Path) -> None:
    times_s = sample_times(600)
    wave = np.where(times_s % 5 < 2.5, 12.0, 0.0)
    path = write_columns(tmp_path / "two.csv", times_s, {"OUT1": wave, "OUT2": wave[::-1]})
    ran = run_here(capsys, "measure", path)
    assert ran.code == 2
    assert "--channel" in ran.err
    assert run_here(capsys, "measure", path, "--channel", "OUT2").code == 0
