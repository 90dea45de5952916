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


@pytest.mark.parametrize("limit", [1 << 20, 0], ids=["in memory", "mapped"])
def test_cut_bare_array_is_read_to_its_last_whole_row(read: Read, limit: int) -> None:
    table = np.column_stack([TIME, VOLTS])
    capture = read(bare(table)[:-30], "a.npy", limit=limit)
    assert values_of(capture.traces[0]).tolist() == VOLTS[:98].tolist()
    assert codes_of(capture)[-1] == "file-cut"
    assert "promises 100 rows" in capture.warnings[-1].text


def test_cut_table_that_stands_column_by_column_is_refused(read: Read) -> None:
    with pytest.raises(MalformedCaptureError, match="cut"):
        read(bare(np.asfortranarray(np.column_stack([TIME, VOLTS])))[:-30], "a.npy")


def with_shape(array: Any, shape: str) -> bytes:
    """Return a bare array whose header tells another shape."""
    content, told = bare(array), str(array.shape).encode()
    grown = len(shape) - len(told)
    return content.replace(told + b", }" + b" " * grown, shape.encode() + b", }", 1)


@pytest.mark.parametrize("shape", ["(-3,)", "(2, 10**9)", "(True,)", "(1e3,)", "('a',)"])
def test_header_that_lies_is_refused(read: Read, shape: str) -> None:
    with pytest.raises(MalformedCaptureError):
        read(with_shape(VOLTS, shape), "a.npy", interval_s=1.0)


def test_huge_shape_in_a_small_file_is_said(read: Read) -> None:
    capture = read(with_shape(VOLTS, "(10000000000000,)"), "a.npy", interval_s=5e-6)
    assert values_of(capture.traces[0]).tolist() == VOLTS.tolist()
    assert "promises 10000000000000 rows" in capture.warnings[-1].text


DTYPES = ["u1", "i1", "<i2", ">i2", "<u2", "<i4", ">i4", "<u4", "<i8", ">u8", "f2", ">f4", ">f8"]


@pytest.mark.parametrize("kind", ["plain", "rows", "columns", "fortran", "fields", "archive"])
@pytest.mark.parametrize("limit", [1 << 20, 0], ids=["in memory", "mapped"])
@pytest.mark.parametrize("dtype", DTYPES)
def test_any_number_in_any_order_is_read(read: Read, dtype: str, limit: int, kind: str) -> None:
    values = np.random.default_rng(1).integers(0, 100, (700, 3)).astype(dtype)
    fields = np.zeros(700, [("odd", "u1"), ("a", dtype), ("b", dtype), ("c", dtype)])
    for k, name in enumerate("abc"):
        fields[name] = values[:, k]
    content = {
        "plain": lambda: bare(values[:, 0]),
        "rows": lambda: bare(np.ascontiguousarray(values.T)),
        "columns": lambda: bare(values),
        "fortran": lambda: bare(np.asfortranarray(values)),
        "fields": lambda: bare(fields),
        "archive": lambda: archive(A=values[:, 0], B=values[:, 1], C=np.asfortranarray(values)),
    }[kind]()
    traces = read(content, "a.npy", limit=limit, interval_s=1.0).traces
    found = [values_of(trace).tolist() for trace in traces]
    truth = values.T.astype(float).tolist()
    assert found == {
        "plain": truth[:1],
        "fields": [[0.0] * 700, *truth],
        "archive": [*truth[:2], *truth],
    }.get(kind, truth)
    assert all(trace.samples.dtype.isnative for trace in traces)  # type: ignore[union-attr]


@pytest.mark.parametrize("packed", [False, True])
def test_members_of_an_archive_are_mapped_or_unpacked(read: Read, packed: bool) -> None:
    file = io.BytesIO()
    save = np.savez_compressed if packed else np.savez
    save(file, OUT=np.arange(100_000) % 7, time_s=np.arange(100_000) * 1e-3)
    trace = read(file.getvalue(), "a.npz", limit=0).traces[0]
    assert isinstance(trace, Waveform)
    assert values_of(trace).tolist() == [i % 7 for i in range(100_000)]
    assert isinstance(trace.time, UniformTime)
    assert trace.time.dt_s == pytest.approx(1e-3)


def test_table_in_an_archive_keeps_its_columns_apart(read: Read) -> None:
    capture = read(archive(data=np.column_stack([TIME, VOLTS])), "a.npz")
    assert [trace.channel for trace in capture.traces] == ["column 2"]
    assert values_of(capture.traces[0]).tolist() == VOLTS.tolist()


@pytest.mark.parametrize("shape", [(), (0,), (10, 10, 10), (100, 100), (1,)])
def test_array_that_is_no_row_of_samples_is_refused(read: Read, shape: tuple[int, ...]) -> None:
    with pytest.raises(MalformedCaptureError) as caught:
        read(bare(np.zeros(shape)), "a.npy", interval_s=1.0)
    assert caught.value.code == "no-values"


def test_archive_that_would_unpack_to_a_huge_size_is_refused(
    read: Read, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("benchtool.formats.arrayfile._BOMB_BYTES", 1 << 20)
    file = io.BytesIO()
    np.savez_compressed(file, OUT=np.zeros(1 << 20, np.uint8), time=np.zeros(1 << 20))
    with pytest.raises(MalformedCaptureError) as caught:
        read(file.getvalue(), "a.npz")
    assert caught.value.code == "unpacks-too-large"


@pytest.mark.parametrize("limit", [1 << 20, 0], ids=["in memory", "mapped"])
def test_rows_out_of_order_are_left_out_of_time_and_values(read: Read, limit: int) -> None:
    times = np.cumsum(np.random.default_rng(1).uniform(0.5, 1.5, 1000))
    values = np.arange(1000.0)
    times[[300, 700]] = np.nan
    trace = read(archive(time_s=times, OUT=values), "a.npz", limit=limit).traces[0]
    assert isinstance(trace, Waveform)
    assert values_of(trace).tolist() == np.delete(values, [300, 700]).tolist()
    kept = np.concatenate(list(trace.time.stamps.blocks(290, 710)))  # type: ignore[union-attr]
    assert kept == pytest.approx(np.delete(times, [300, 700])[290:710] - times[0])


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
