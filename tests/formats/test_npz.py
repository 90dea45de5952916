"""NumPy archives: our own layout, and what others save."""

from __future__ import annotations

import io
from typing import Any

import numpy as np
import pytest
from read_back import Read, codes_of, values_of

from benchtool.errors import AmbiguousStructureError, MalformedCaptureError
from benchtool.model.capture import LogicTrace, StampedTime, UniformTime, Waveform

VOLTS = np.where(np.arange(100) // 7 % 2, 4.75, 0.25)
TIME = np.arange(100) * 5e-6


def archive(**arrays: Any) -> bytes:
    file = io.BytesIO()
    np.savez(file, **arrays)
    return file.getvalue()


def bare(array: Any) -> bytes:
    file = io.BytesIO()
    np.save(file, array)
    return file.getvalue()


def test_own_layout_by_hand(read: Read) -> None:
    codes = np.arange(-50, 50, dtype=np.int16)
    capture = read(archive(samples=codes, dt=5e-6, gain=0.02, offset=1.0, channel="OUT"), "a.npz")
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert trace.channel == "OUT"
    assert trace.samples.dtype == np.int16
    assert trace.time == UniformTime(dt_s=5e-6)
    assert values_of(trace) == pytest.approx(codes * 0.02 + 1.0)
    assert codes_of(capture) == []


def test_own_layout_with_transitions(read: Read) -> None:
    content = archive(
        times=[1.0, 2.5],
        states=[1, 0],
        spans=[[0.0, 4.0, 0]],
        tick=0.5,
        end_known=True,
        channel="OUT",
    )
    trace = read(content, "a.npz").traces[0]
    assert isinstance(trace, LogicTrace)
    assert trace.states.tolist() == [True, False]
    assert trace.tick_s == 0.5


@pytest.mark.parametrize(
    ("name", "factor", "codes"),
    [
        ("time", 1.0, ["assumed-time-unit", "assumed-volts"]),
        ("t", 1.0, ["assumed-time-unit", "assumed-volts"]),
        ("time_ms", 1e3, ["assumed-volts"]),
        ("t_us", 1e6, ["assumed-volts"]),
    ],
)
def test_foreign_archive_with_time(read: Read, name: str, factor: float, codes: list[str]) -> None:
    capture = read(archive(**{"OUT": VOLTS, name: TIME * factor}), "a.npz")
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert trace.channel == "OUT"
    assert isinstance(trace.time, UniformTime)
    assert trace.time.dt_s == pytest.approx(5e-6, rel=1e-9)
    assert codes_of(capture) == codes


def test_foreign_archive_with_uneven_time(read: Read) -> None:
    times = np.cumsum(np.random.default_rng(1).uniform(0.5, 1.5, 100))
    trace = read(archive(time_s=times, OUT=VOLTS), "a.npz").traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, StampedTime)
    assert np.concatenate(list(trace.time.stamps.blocks())) == pytest.approx(times - times[0])


@pytest.mark.parametrize(
    "statement", [{"dt": 5e-6}, {"fs": 2e5}, {"sample_rate": 2e5}, {"interval_us": 5.0}]
)
def test_foreign_archive_with_interval_or_rate(read: Read, statement: dict[str, float]) -> None:
    trace = read(archive(OUT=VOLTS, **statement), "a.npz").traces[0]
    assert isinstance(trace, Waveform)
    assert trace.time.dt_s == pytest.approx(5e-6)  # type: ignore[union-attr]


def test_foreign_archive_without_time_is_refused(read: Read) -> None:
    with pytest.raises(AmbiguousStructureError) as caught:
        read(archive(OUT=VOLTS), "a.npz")
    assert "--interval" in caught.value.hint


def test_bare_array_needs_an_interval(read: Read) -> None:
    with pytest.raises(AmbiguousStructureError):
        read(bare(VOLTS), "a.npy")
    trace = read(bare(VOLTS), "a.npy", interval_s=5e-6).traces[0]
    assert isinstance(trace, Waveform)
    assert trace.channel == "column 1"
    assert values_of(trace).tolist() == VOLTS.tolist()


@pytest.mark.parametrize("turned", [False, True])
def test_bare_table_takes_its_rising_column_as_time(read: Read, turned: bool) -> None:
    table = np.column_stack([TIME, VOLTS])
    capture = read(bare(table.T if turned else table), "a.npy")
    assert [t.channel for t in capture.traces] == ["column 2"]
    assert "assumed-time-unit" in codes_of(capture)


def test_integers_are_codes_and_booleans_logic(read: Read) -> None:
    capture = read(archive(time_s=TIME, ADC=np.arange(100) * 4, D0=VOLTS > 1), "a.npz")
    adc, d0 = capture.traces
    assert isinstance(adc, Waveform)
    assert isinstance(d0, Waveform)
    assert adc.scale.step_v == 4
    assert d0.is_logic


def test_pickled_objects_are_never_loaded(read: Read) -> None:
    with pytest.raises(MalformedCaptureError) as caught:
        read(archive(samples=np.array([{"a": 1}, None], dtype=object), dt=1.0), "a.npz")
    assert caught.value.code == "pickled"


@pytest.mark.parametrize("keep", [0.3, 0.9])
def test_cut_archive(read: Read, keep: float) -> None:
    content = archive(samples=VOLTS, dt=5e-6)
    with pytest.raises(MalformedCaptureError, match="damaged"):
        read(content[: int(keep * len(content))], "a.npz")


def test_cut_bare_array(read: Read) -> None:
    with pytest.raises(MalformedCaptureError):
        read(bare(VOLTS)[:-30], "a.npy", interval_s=1.0)


@pytest.mark.parametrize(
    "arrays",
    [
        {"samples": VOLTS, "time": TIME[:50]},
        {"samples": VOLTS, "dt": -1.0},
        {"samples": VOLTS, "dt": 1.0, "spans": [[0, 500, 0.0]]},
        {"OUT": VOLTS, "time_s": TIME[:50]},
    ],
)
def test_arrays_that_contradict_each_other(read: Read, arrays: dict[str, Any]) -> None:
    with pytest.raises(MalformedCaptureError, match="contradict"):
        read(archive(**arrays), "a.npz")


def test_archive_without_numbers(read: Read) -> None:
    with pytest.raises(MalformedCaptureError) as caught:
        read(archive(note=np.array(["wet", "dry"])), "a.npz")
    assert caught.value.code == "no-values"
