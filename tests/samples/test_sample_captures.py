"""The sample captures give what their README says, and the README says what physics gives."""

from __future__ import annotations

import gzip
import importlib.util
import math
import shutil
import subprocess
import sys
from dataclasses import dataclass
from pathlib import Path
from types import ModuleType

import pytest
from node_equation import Astable, OneShot, Schmitt

from benchtool.cli.exits import BY_VERDICT
from benchtool.model.quantity import Measured
from benchtool.pipeline import analyse
from benchtool.uncertainty import expanded

SAMPLES = Path(__file__).parents[2] / "sample_captures"
TIMES = ("first_high", "t_high", "t_low")

GOOD = Astable()
BOARDS = {
    "good_board.csv": GOOD,
    "good_board.vcd": GOOD,
    "good_board_transitions.csv": GOOD,
    "good_board_european.txt": GOOD,
    "good_board_states.csv": GOOD,
    "power_up.csv": GOOD,
    "too_short.csv": GOOD,
    "marginal_board.tsv": Astable(C=41.76e-6),
    "c_20_percent_low.csv": Astable(C=0.8 * 47e-6),
    "leaky_c.csv": Astable(shunt=2.2e6),
    "wrong_rb.txt": Astable(RB=33e3),
    "rippling_supply.csv.gz": Astable(ripple=0.05, ripple_hz=100.0),
    "node_probed.csv": Astable(shunt=10e6),
    "one_shot.csv": OneShot(),
    "schmitt_heartbeat.csv": Schmitt(),
}
"""The boards as they are, from the words of the README; a stuck one has no times."""


@dataclass(frozen=True, kw_only=True)
class Promise:
    """A line of the README's table; times as printed, None where there is none."""

    file: str
    design: str
    times: dict[str, str | None]
    verdict: str
    exit_code: int


def promises() -> list[Promise]:
    text = (SAMPLES / "README.md").read_text(encoding="utf-8")
    table = text.partition("<!-- samples -->")[2].partition("<!-- end -->")[0]
    rows = [line.strip("| ").split(" | ") for line in table.strip().splitlines()[2:]]
    return [
        Promise(
            file=file,
            design=design,
            times={
                name: None if cell == "none" else cell
                for name, cell in zip(TIMES, cells, strict=True)
            },
            verdict=verdict,
            exit_code=int(code),
        )
        for file, design, *cells, verdict, code in rows
    ]


PROMISES = promises()
each = pytest.mark.parametrize("promise", PROMISES, ids=lambda promise: promise.file)


def last_digit(printed: str) -> float:
    return 10.0 ** -len(printed.partition(".")[2])


@pytest.fixture(scope="module")
def make() -> ModuleType:
    spec = importlib.util.spec_from_file_location("make_samples", SAMPLES / "make.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules[spec.name] = module
    spec.loader.exec_module(module)
    return module


def test_every_capture_has_its_line_and_every_line_its_capture() -> None:
    other = {".toml", ".py", ".md"}
    captures = {
        path.name for path in SAMPLES.iterdir() if path.is_file() and path.suffix not in other
    }
    assert captures == {promise.file for promise in PROMISES}
    assert len(captures) >= 12


def test_every_verdict_but_the_conditional_ones_occurs() -> None:
    assert {promise.verdict for promise in PROMISES} == {"pass", "fail", "undecided", "unusable"}


@each
def test_the_printed_times_are_those_of_the_node_equation(promise: Promise) -> None:
    printed = {name: cell for name, cell in promise.times.items() if cell is not None}
    if promise.file not in BOARDS:
        assert not printed
        return
    board = BOARDS[promise.file]
    true = board.times() if printed else {}
    # rounding, and on a rippling supply one period of the ripple
    ripple_s = 1 / board.ripple_hz if isinstance(board, Astable) and board.ripple else 0.0
    for name, cell in printed.items():
        assert abs(float(cell) - true[name]) <= 0.501 * last_digit(cell) + ripple_s, name


@each
def test_the_capture_gives_what_the_table_says(promise: Promise) -> None:
    analysis = analyse(SAMPLES / promise.file, SAMPLES / promise.design)
    assert analysis.verdict == promise.verdict
    assert BY_VERDICT[analysis.verdict] == promise.exit_code
    timing = analysis.results[0].timing
    assert timing is not None
    for name, cell in promise.times.items():
        measured = getattr(timing, name)
        if cell is None:
            continue
        assert isinstance(measured, Measured), name
        # 99.9 %, since of thirty figures at 95 % one or two miss by right; and never a wide U
        off = abs(measured.value - float(cell))
        assert off <= expanded(measured, 0.999) + last_digit(cell), name
        assert off <= 2.5e-3 * float(cell), name


def test_a_time_that_the_record_does_not_hold_is_not_measured() -> None:
    for promise in PROMISES:
        if promise.verdict == "unusable" or promise.file == "stuck_high.csv":
            timing = analyse(SAMPLES / promise.file, SAMPLES / promise.design).results[0].timing
            assert timing is not None
            assert not isinstance(timing.t_high, Measured)
            assert not isinstance(timing.period, Measured)


def test_the_marginal_board_is_undecided_for_its_period_alone() -> None:
    checks = analyse(SAMPLES / "marginal_board.tsv", SAMPLES / "mist_valve.toml").results[0].checks
    assert {check.quantity for check in checks if check.verdict == "undecided"} == {"period"}
    assert {check.verdict for check in checks if check.quantity != "period"} == {"pass"}


def test_the_leaky_capacitor_fails_by_its_high_time_though_its_period_passes() -> None:
    checks = analyse(SAMPLES / "leaky_c.csv", SAMPLES / "mist_valve.toml").results[0].checks
    verdicts = {check.quantity: check.verdict for check in checks}
    assert verdicts["t_high"] == "fail"
    assert verdicts["period"] == "pass"


@pytest.mark.parametrize(
    "file", ["schmitt_heartbeat.csv", "good_board.vcd", "rippling_supply.csv.gz", "one_shot.csv"]
)
def test_making_a_sample_again_gives_the_same_bytes(make: ModuleType, file: str) -> None:
    sample = next(sample for sample in make.SAMPLES if sample.file == file)
    content, _ = make.make(sample)
    stored = (SAMPLES / file).read_bytes()
    if file.endswith(".gz"):  # how tightly zlib packs is its own affair
        content, stored = gzip.decompress(content), gzip.decompress(stored)
    assert content == stored


def test_the_script_writes_every_sample(tmp_path: Path, make: ModuleType) -> None:
    for path in SAMPLES.iterdir():
        if path.suffix in (".toml", ".py"):
            shutil.copy(path, tmp_path)
    script, folder = tmp_path / "make.py", tmp_path / "made"
    subprocess.run([sys.executable, script, folder], check=True)
    assert {path.name for path in folder.iterdir()} == {sample.file for sample in make.SAMPLES}
    assert (folder / "good_board.csv").read_bytes() == (SAMPLES / "good_board.csv").read_bytes()


def test_no_sample_is_large() -> None:
    sizes = {path.name: path.stat().st_size for path in SAMPLES.iterdir() if path.is_file()}
    assert max(sizes.values()) < 300_000


def test_the_node_equation_gives_the_textbook_times() -> None:
    ideal = Astable(r_on=1e-6).times()
    assert ideal["t_high"] == pytest.approx(430e3 * 47e-6 * math.log(2), rel=1e-7)
    assert ideal["t_low"] == pytest.approx(330e3 * 47e-6 * math.log(2), rel=1e-7)
    assert ideal["first_high"] == pytest.approx(430e3 * 47e-6 * math.log(3), rel=1e-7)
