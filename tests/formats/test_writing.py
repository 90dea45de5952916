"""What we write we read back: text, value change dumps and archives."""

from __future__ import annotations

import io
from collections.abc import Callable
from pathlib import Path
from typing import BinaryIO

import numpy as np
import pytest
from read_back import Read, codes_of, times_of, values_of

from benchtool.errors import InputError, UsageError
from benchtool.formats import FORMATS, Format, write_npz, write_text, write_vcd
from benchtool.model.capture import (
    ArraySamples,
    Capture,
    LogicTrace,
    Origin,
    Scale,
    Span,
    StampedTime,
    TimeSpan,
    Trace,
    UniformTime,
    Waveform,
)

Write = Callable[[Capture, BinaryIO | Path], None]
ORIGIN = Origin(source="bench", format="simulated", sha256="")


def capture_of(*traces: Trace) -> Capture:
    return Capture(origin=ORIGIN, traces=traces)


def written(write: Write, capture: Capture) -> bytes:
    file = io.BytesIO()
    write(capture, file)
    assert not file.closed
    return file.getvalue()


def waveform(n: int = 500, *, dt_s: float = 5e-6, channel: str = "OUT", **more: object) -> Waveform:
    codes = np.random.default_rng(n).integers(-128, 128, n).astype(np.int16)
    fields: dict[str, object] = {
        "samples": ArraySamples(codes),
        "scale": Scale(gain=0.04, offset=2.5, step_v=0.04),
        "time": UniformTime(dt_s=dt_s),
        "spans": (Span(start=0, stop=n, start_s=0.0),),
        "channel": channel,
    }
    return Waveform(**(fields | more))  # type: ignore[arg-type]


LOGIC = LogicTrace(
    times_s=np.array([1.5, 2.25, 6.0, 7.5]),
    states=np.array([True, False, True, False]),
    spans=(
        TimeSpan(start_s=0.0, end_s=3.0, starts_high=False),
        TimeSpan(start_s=5.0, end_s=9.0, starts_high=False),
    ),
    tick_s=0.25,
    channel="OUT",
)


@pytest.mark.parametrize("dt_s", [5e-6, 1 / 3, 1 / 44100, 0.025, 2.0, 1e-9])
def test_text_keeps_samples_and_step(read: Read, dt_s: float) -> None:
    trace = waveform(dt_s=dt_s)
    capture = read(written(write_text, capture_of(trace)))
    back = capture.traces[0]
    assert isinstance(back, Waveform)
    assert (back.channel, back.unit) == ("OUT", "V")
    assert values_of(back) == pytest.approx(values_of(trace), rel=1e-11)  # twelve digits printed
    assert back.time.dt_s == pytest.approx(dt_s, rel=2e-6 / 499 + 1e-12)  # type: ignore[union-attr]
    assert codes_of(capture) == []
    assert back.scale.step_v == pytest.approx(0.04)


def test_text_keeps_floats_to_the_last_bit(read: Read) -> None:
    volts = np.random.default_rng(1).normal(0, 1, 300)
    trace = waveform(300, samples=ArraySamples(volts), scale=Scale())
    assert (
        values_of(read(written(write_text, capture_of(trace))).traces[0]).tolist() == volts.tolist()
    )


def test_text_keeps_holes_missing_values_and_logic(read: Read) -> None:
    volts = np.arange(300) / 4.0
    volts[40] = np.nan
    spans = (Span(start=0, stop=100, start_s=0.0), Span(start=100, stop=300, start_s=0.7))
    first = waveform(300, dt_s=0.005, samples=ArraySamples(volts), scale=Scale(), spans=spans)
    states = (np.arange(300) // 20 % 2).astype(np.uint8)
    second = waveform(
        300,
        dt_s=0.005,
        samples=ArraySamples(states),
        scale=Scale(),
        spans=spans,
        unit="1",
        channel="D0",
    )
    capture = read(written(write_text, capture_of(first, second)))
    out, d0 = capture.traces
    assert isinstance(out, Waveform)
    assert isinstance(d0, Waveform)
    assert [(s.start, s.stop) for s in out.spans] == [(0, 100), (100, 300)]
    assert out.spans[1].start_s == pytest.approx(0.7)
    assert np.isnan(values_of(out)[40])
    assert d0.is_logic
    assert values_of(d0).tolist() == states.tolist()


def test_text_keeps_uneven_stamps(read: Read) -> None:
    stamps = np.cumsum(np.random.default_rng(2).uniform(0.5, 1.5, 300))
    stamps -= stamps[0]
    trace = waveform(300, time=StampedTime(stamps=ArraySamples(stamps)))
    back = read(written(write_text, capture_of(trace))).traces[0]
    assert isinstance(back, Waveform)
    assert isinstance(back.time, StampedTime)
    assert np.concatenate(list(back.time.stamps.blocks())).tolist() == stamps.tolist()


def test_text_refuses_traces_without_a_common_time() -> None:
    with pytest.raises(UsageError, match="common time"):
        written(write_text, capture_of(waveform(), waveform(dt_s=1.0)))
    with pytest.raises(UsageError, match="common time"):
        written(write_text, capture_of(waveform(), LOGIC))


def same_logic(back: Trace, trace: LogicTrace) -> None:
    assert isinstance(back, LogicTrace)
    assert back.times_s == pytest.approx(trace.times_s, abs=1e-12)
    assert back.states.tolist() == trace.states.tolist()
    assert [(s.start_s, s.end_s, s.starts_high) for s in back.spans] == [
        (pytest.approx(s.start_s), pytest.approx(s.end_s), s.starts_high) for s in trace.spans
    ]
    assert back.end_known == trace.end_known


@pytest.mark.parametrize(
    ("write", "name"), [(write_text, "a.csv"), (write_vcd, "a.vcd"), (write_npz, "a.npz")]
)
def test_logic_with_a_gap_is_read_back(read: Read, write: Write, name: str) -> None:
    same_logic(read(written(write, capture_of(LOGIC)), name).traces[0], LOGIC)


@pytest.mark.parametrize("write", [write_text, write_vcd])
def test_record_that_ends_with_its_last_edge(read: Read, write: Write) -> None:
    trace = LogicTrace(
        times_s=np.array([1.5, 2.25, 6.0]),
        states=np.array([True, False, True]),
        spans=(TimeSpan(start_s=0.0, end_s=6.0, starts_high=False),),
        tick_s=0.25,
        channel="OUT",
        end_known=False,
    )
    same_logic(read(written(write, capture_of(trace)), "a").traces[0], trace)


def test_dump_keeps_many_traces_apart(read: Read) -> None:
    traces = [
        LogicTrace(
            times_s=np.array([k + 1.0]),
            states=np.array([True]),
            spans=(TimeSpan(start_s=0.0, end_s=200.0, starts_high=False),),
            tick_s=1.0,
            channel=f"D {k}",
        )
        for k in range(120)
    ]
    back = read(written(write_vcd, capture_of(*traces)), "a.vcd").traces
    assert [t.channel for t in back] == [f"D_{k}" for k in range(120)]
    assert [t.times_s[0] for t in back] == pytest.approx(range(1, 121))  # type: ignore[union-attr]


def test_dump_refuses_waveforms() -> None:
    with pytest.raises(UsageError, match="logic only"):
        written(write_vcd, capture_of(waveform()))


def test_archive_keeps_a_capture_whole(read: Read) -> None:
    spans = (Span(start=0, stop=100, start_s=0.0), Span(start=100, stop=500, start_s=0.7))
    stamps = np.cumsum(np.random.default_rng(2).uniform(0.5, 1.5, 500))
    traces = (
        waveform(time=UniformTime(dt_s=5e-6, u_rel=1e-5), spans=spans),
        waveform(time=StampedTime(stamps=ArraySamples(stamps - stamps[0]), resolution_s=1e-3)),
        LOGIC,
    )
    back = read(written(write_npz, capture_of(*traces)), "a.npz").traces
    first, second, third = back
    assert isinstance(first, Waveform)
    assert isinstance(second, Waveform)
    assert (first.time, first.spans, first.scale) == (traces[0].time, spans, traces[0].scale)  # type: ignore[union-attr]
    assert first.samples.dtype == np.int16
    assert values_of(first).tolist() == values_of(traces[0]).tolist()
    assert isinstance(second.time, StampedTime)
    assert second.time.resolution_s == 1e-3
    same_logic(third, LOGIC)
    assert third.tick_s == 0.25  # type: ignore[union-attr]


def test_path_is_written_and_closed(tmp_path: Path) -> None:
    write_text(capture_of(waveform()), tmp_path / "a.csv")
    assert (tmp_path / "a.csv").read_bytes() == written(write_text, capture_of(waveform()))


def test_path_that_cannot_be_written(tmp_path: Path) -> None:
    with pytest.raises(InputError):
        write_text(capture_of(waveform()), tmp_path / "nowhere" / "a.csv")


def test_each_format_that_writes_reads_its_own(read: Read) -> None:
    for name, loaded in FORMATS.each_of_ours():
        assert isinstance(loaded, Format)
        assert loaded.name == name
        if loaded.write is not None:
            content = written(loaded.write, capture_of(LOGIC))
            assert read(content, f"a{loaded.suffixes[0]}").origin.format == name


def test_times_of_a_written_hole(read: Read) -> None:
    spans = (Span(start=0, stop=100, start_s=0.0), Span(start=100, stop=500, start_s=0.7))
    trace = waveform(dt_s=0.005, spans=spans)
    assert times_of(read(written(write_text, capture_of(trace))).traces[0]) == pytest.approx(
        times_of(trace)
    )
