"""A counter's readings in a file: what was written is read back, and every verb goes on from it."""

from __future__ import annotations

import io
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from benchtool.errors import InputError, MalformedCaptureError, UsageError
from benchtool.formats import read_capture, write_counted
from benchtool.formats.content import open_content
from benchtool.formats.counted import is_counted, read_counted
from benchtool.model.capture import ReadOptions
from benchtool.model.counted import Counted, Readings
from benchtool.model.options import MeasureOptions
from benchtool.model.quantity import Notice
from benchtool.pipeline import analyse, look, measure, solve

RNG = np.random.default_rng(11)


def scattered(value: float, n: int) -> np.ndarray:
    found: np.ndarray = value * (1 + 1e-4 * RNG.standard_normal(n))
    return found


COUNTED = Counted(
    source="TCPIP::192.0.2.7::hislip0::INSTR",
    identity="Invented,Counter,0,1.0",
    dialect="counter-scpi99",
    channel="1",
    readings={
        "t_high": Readings(values=scattered(14.01, 20), n_missing=2),
        "t_low": Readings(values=scattered(10.75, 21)),
        "period": Readings(values=scattered(24.76, 22), chains=((0, 10), (10, 22))),
        "frequency": Readings(values=scattered(1 / 24.76, 5), per="gate", gate_s=100.0),
        "duty": Readings(values=scattered(0.5658, 6), per="gate"),
    },
    resolution_s=1e-9,
    start_ns=1_800_000_000_123_456_789,
    settings=(("INP1:LEV?", "+2.5E+00"),),
    warnings=(Notice(code="readings-missing", text="2 of 22 readings are marked as none"),),
)
DESIGN = Path(__file__).parents[2] / "sample_captures" / "mist_valve.toml"
"""The invented greenhouse misting controller of the examples."""


@pytest.fixture
def path(tmp_path: Path) -> Path:
    path = tmp_path / "readings.npz"
    write_counted(COUNTED, path)
    return path


def assert_same(found: Counted, written: Counted) -> None:
    names = ("identity", "dialect", "channel", "resolution_s", "start_ns", "settings", "warnings")
    for name in names:
        assert getattr(found, name) == getattr(written, name)
    assert list(found.readings) == list(written.readings)
    for name, item in written.readings.items():
        read = found.readings[name]
        np.testing.assert_array_equal(read.values, item.values)
        assert (read.per, read.gate_s, read.n_missing, read.chains) == (
            item.per,
            item.gate_s,
            item.n_missing,
            item.chains,
        )


def test_nothing_is_lost_in_a_file(path: Path) -> None:
    content = open_content(path)
    assert is_counted(content)
    found = read_counted(content)
    assert_same(found, COUNTED)
    assert (found.source, found.sha256) == (str(path), content.sha256)


def test_a_bare_run_is_read_back_too(tmp_path: Path) -> None:
    bare = replace(
        COUNTED,
        readings={"t_high": Readings(values=np.array([1.5]))},
        settings=(),
        warnings=(),
        start_ns=None,
    )
    path = tmp_path / "bare.npz"
    write_counted(bare, path)
    assert_same(read_counted(open_content(path)), bare)


def test_a_capture_of_our_own_holds_no_readings(tmp_path: Path) -> None:
    path = tmp_path / "capture.npz"
    np.savez(path, time=np.arange(9.0), counted=np.zeros(9))
    assert not is_counted(open_content(path))


def test_measure_solve_and_judge_give_the_figures_of_the_readings_in_memory(
    path: Path,
) -> None:
    for here, filed in (
        (measure(COUNTED), measure(path)),
        (solve(COUNTED, DESIGN), solve(path, DESIGN)),
        (analyse(COUNTED, DESIGN), analyse(path, DESIGN)),
    ):
        (one,), (other,) = here.results, filed.results
        assert one.timing == other.timing
        assert one.timing is not None
        assert one.jitter == other.jitter
        assert one.solution == other.solution
        assert (one.checks, one.verdict) == (other.checks, other.verdict)
        assert one.trace is None
        assert one.counted is COUNTED
        assert_same(other.counted or COUNTED, COUNTED)
        assert filed.sources[0].name == str(path)
        assert filed.sources[0].instrument == COUNTED.identity
        assert {notice.code for notice in filed.warnings} == {"readings-missing"}
    assert filed.verdict == "pass"
    assert {check.quantity for check in other.checks} >= {"period", "t_high", "t_low"}


def test_a_board_that_is_out_of_its_limits_fails() -> None:
    slow = replace(COUNTED, readings={"period": Readings(values=scattered(31.0, 9))})
    analysis = analyse(slow, DESIGN)
    assert analysis.verdict == "fail"


def test_a_baseline_may_be_readings(path: Path) -> None:
    changes = measure(path, baseline=path).results[0].changes
    assert changes
    assert not any(change.significant for change in changes)


def test_look_says_what_it_is_and_names_measure(path: Path) -> None:
    for read in (lambda: look([path]), lambda: read_capture(path)):
        with pytest.raises(MalformedCaptureError) as caught:
            read()
        assert caught.value.code == "counter-readings"
        assert "holds a counter's readings" in caught.value.message
        assert f"benchtool measure {path}" in caught.value.hint


@pytest.mark.parametrize(
    "options",
    [
        MeasureOptions(read=ReadOptions(channel="1")),
        MeasureOptions(read=ReadOptions(interval_s=1.0)),
        MeasureOptions(level_v=2.5),
    ],
)
def test_options_about_a_record_are_refused(path: Path, options: MeasureOptions) -> None:
    with pytest.raises(UsageError) as caught:
        measure(path, options=options)
    assert caught.value.code == "counter-readings"


def test_the_timebase_that_the_user_states_counts(path: Path) -> None:
    timing = measure(path, options=MeasureOptions(timebase_rel=1e-2)).results[0].timing
    assert timing is not None
    assert timing.period is not None
    sources = {term.source: term.u for term in timing.period.budget}  # type: ignore[union-attr]
    assert sources["timebase"] == pytest.approx(24.76 * 1e-2 / 3**0.5, rel=1e-4)  # the mean of 22


def rewritten(path: Path, **changed: object) -> None:
    with np.load(path) as archive:
        arrays = {name: archive[name] for name in archive.files}
    arrays.update(changed)  # type: ignore[arg-type]  # arrays of any kind
    np.savez(path, **{name: value for name, value in arrays.items() if value is not None})


@pytest.mark.parametrize(
    "changed",
    [
        {"counted": 2},
        {"period.per": "hour"},
        {"period": np.array([np.nan])},
        {"period": np.ones((2, 2))},
        {"resolution": -1.0},
        {"identity": None},
        {"period.missing": None},
        {"t_high": None, "t_low": None, "period": None, "frequency": None, "duty": None},
        {"warnings": np.array(["a"])},
        {"period": np.array([{}], dtype=object)},
    ],
)
def test_damage_inside_is_named(path: Path, changed: dict[str, object]) -> None:
    rewritten(path, **changed)
    with pytest.raises(MalformedCaptureError) as caught:
        measure(path)
    assert caught.value.code == "damaged-readings"


@pytest.mark.parametrize("share", [0.1, 0.5, 0.9, 0.999])
def test_a_file_that_was_cut_short_is_named(path: Path, share: float) -> None:
    data = path.read_bytes()
    path.write_bytes(data[: int(share * len(data))])
    with pytest.raises(MalformedCaptureError) as caught:
        measure(path)
    assert caught.value.code == "damaged-readings"


def test_bytes_that_were_changed_are_named_or_harmless(path: Path) -> None:
    data = path.read_bytes()
    rng = np.random.default_rng(5)
    for at in rng.integers(len(data), size=300):
        broken = bytearray(data)
        broken[at] ^= 1 << int(rng.integers(8))
        path.write_bytes(bytes(broken))
        try:
            measure(path)
        except (MalformedCaptureError, InputError):
            continue


def test_a_file_that_cannot_be_written_is_named(tmp_path: Path) -> None:
    with pytest.raises(InputError):
        write_counted(COUNTED, tmp_path / "none" / "readings.npz")
    sink = io.BytesIO()
    write_counted(COUNTED, sink)
    assert sink.getvalue().startswith(b"PK")
