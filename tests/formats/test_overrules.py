"""What the user says of a file wins over what was found, or is refused where it has no use."""

from __future__ import annotations

import io
import wave
from pathlib import Path

import numpy as np
import pytest
from read_back import Read, codes_of, point, times_of, values_of

from benchtool.errors import MalformedCaptureError, UsageError
from benchtool.formats import read_capture
from benchtool.model.capture import (
    Capture,
    LogicTrace,
    ReadOptions,
    StampedTime,
    StructurePoint,
    Waveform,
)

WAVE = [4.75 if i % 9 > 4 else 0.25 for i in range(60)]
TWO_CLOCKS = "Time (ms),Elapsed (us),OUT (V),CAP (V)\n" + "".join(
    f"{5 * i}.0,{7 * i}.0,{v},{i % 4}.5\n" for i, v in enumerate(WAVE)
)
ONE_CLOCK = "Time (ms),OUT (V)\n" + "".join(f"{5 * i}.0,{v}\n" for i, v in enumerate(WAVE))
LIST = "time_s,OUT\n" + "".join(f"{0.3 * i + 0.1 * (i % 2):.3f},{i % 2}\n" for i in range(30))
DUMP = (
    "$timescale 1 us $end\n$var wire 1 ! OUT $end\n$enddefinitions $end\n"
    "#0\n0!\n#5\n1!\n#9\n0!\n#15\n1!\n"
)


def found(capture: Capture, name: str) -> StructurePoint:
    return next(p for p in capture.structure if p.name == name)


def waveform(capture: Capture, place: int = 0) -> Waveform:
    trace = capture.traces[place]
    assert isinstance(trace, Waveform)
    return trace


def step_s(capture: Capture) -> float:
    return float(waveform(capture).time.dt_s)  # type: ignore[union-attr]


def sound(seconds: int = 1) -> bytes:
    file = io.BytesIO()
    with wave.open(file, "wb") as written:
        written.setnchannels(1)
        written.setsampwidth(2)
        written.setframerate(1000)
        written.writeframes(np.tile([9000, -9000], 500 * seconds).astype("<i2").tobytes())
    return file.getvalue()


@pytest.mark.parametrize("name", ["Elapsed (us)", "elapsed", "2"])
def test_the_time_column_is_named_as_printed_or_numbered(read: Read, name: str) -> None:
    capture = read(TWO_CLOCKS, time=name)
    assert step_s(capture) == pytest.approx(7e-6)
    assert [trace.channel for trace in capture.traces] == ["OUT", "CAP"]
    assert found(capture, "time") == StructurePoint(
        name="time", value="Elapsed", evidence="--time", sure="stated"
    )


def test_another_column_gives_another_time(read: Read) -> None:
    assert step_s(read(TWO_CLOCKS, time="1")) == pytest.approx(5e-3)


def test_a_column_that_no_name_tells_is_time_if_the_user_says_so(read: Read) -> None:
    text = "a,b,c\n" + "".join(f"{v},{i % 4}.5,{3 * i}\n" for i, v in enumerate(WAVE))
    capture = read(text, time="c", time_unit="ms")
    assert step_s(capture) == pytest.approx(3e-3)
    assert values_of(capture.traces[0]).tolist() == WAVE


def test_the_column_taken_for_time_is_the_channel_where_nothing_else_is_left(read: Read) -> None:
    text = "".join(f"{0.1 * i + 0.05:.2f},{7 * i}.5\n" for i in range(40))
    capture = read(text, time="2", time_unit="s")
    assert [trace.channel for trace in capture.traces] == ["column 1"]
    assert step_s(capture) == pytest.approx(7.0)


def test_no_time_column_counts_the_rows(read: Read) -> None:
    capture = read(TWO_CLOCKS, time="none", interval_s=2e-3)
    assert step_s(capture) == 2e-3
    assert found(capture, "time").value == "none"
    assert [trace.channel for trace in capture.traces] == ["OUT", "CAP"]


@pytest.mark.parametrize(
    ("name", "says"),
    [("Zeit", "no column 'Zeit'"), ("7", "no column '7'"), ("note", "'note' of .* holds no times")],
)
def test_a_wrong_time_column_is_refused_with_those_there_are(
    read: Read, name: str, says: str
) -> None:
    text = "Time (s),OUT (V),note\n" + "".join(f"{i}.5,{i % 2}.5,wet leaf\n" for i in range(30))
    with pytest.raises(UsageError, match=says) as caught:
        read(text, time=name)
    assert caught.value.code == "no-such-column"
    assert "1 Time (s), 2 OUT (V), or none" in caught.value.hint


def test_two_columns_of_one_name_ask_for_the_number(read: Read) -> None:
    text = "X (s),A (V),X (s),B (V)\n" + "".join(
        f"{i}.5,{i % 2}.5,{2 * i}.5,{i % 3}.5\n" for i in range(30)
    )
    with pytest.raises(UsageError, match=r"2 columns 'X'.*number"):
        read(text, time="X")
    assert step_s(read(text, time="3")) == pytest.approx(2.0)


def test_skipped_lines_give_nothing_and_lines_keep_their_numbers(read: Read) -> None:
    rows = "".join(f"{i}.5,{'x,y' if i == 20 else 4.5 * (i % 3)}\n" for i in range(40))
    text = "Interval: 3 ms\n1.0,2.0\nTime (ms),OUT (V)\n" + rows
    capture = read(text, skip=2)
    assert step_s(capture) == pytest.approx(1e-3)
    skipped = next(n for n in capture.warnings if n.code == "rows-skipped")
    assert "line 24" in skipped.text
    assert found(capture, "skip").value == "2 lines"
    assert found(read(text, skip=1), "skip").value == "1 line"


def test_skipping_reaches_a_header_that_is_passed_by_otherwise(read: Read) -> None:
    text = "0,0\n0,0\n0,0\n0,0\n0,0\nms,OUT (V)\n" + "".join(f"{i}.5,{i % 3}.5\n" for i in range(9))
    assert point(read(text, skip=5), "header") == "1 row"
    assert waveform(read(text, skip=5)).channel == "OUT"


def test_skipping_more_lines_than_there_are_is_refused(read: Read) -> None:
    with pytest.raises(UsageError, match="only 61 lines") as caught:
        read(TWO_CLOCKS, skip=61)
    assert caught.value.code == "option-idle"


@pytest.mark.parametrize("codec", ["utf-16", "utf-8-sig", "latin-1"])
def test_skipping_works_in_every_encoding(read: Read, codec: str) -> None:
    text = "Aufzeichnung für Ventil 2\n9;9\nZeit (ms);OUT (V)\n" + "".join(
        f"{i}.5;{i % 3}.5\n" for i in range(40)
    )
    assert step_s(read(text.encode(codec), skip=2)) == pytest.approx(1e-3)


def test_the_interval_given_wins_over_the_time_column_and_is_said(read: Read) -> None:
    capture = read(TWO_CLOCKS, interval_s=1e-3, time="1")
    assert step_s(capture) == 1e-3
    assert codes_of(capture) == ["interval-overruled"]
    assert "0.005 s" in capture.warnings[0].text
    assert found(capture, "interval").value == "0.001 s"
    assert found(capture, "interval").sure == "stated"


def test_an_interval_near_that_of_the_column_is_taken_exactly(read: Read) -> None:
    assert step_s(read(ONE_CLOCK)) == pytest.approx(5e-3)
    assert step_s(read(ONE_CLOCK, interval_s=5.01e-3)) == 5.01e-3


def test_the_interval_keeps_the_holes_of_the_record(read: Read) -> None:
    rows = [i for i in range(60) if not 20 <= i < 30]
    text = "Time (ms),OUT (V)\n" + "".join(f"{5 * i}.0,{WAVE[i]}\n" for i in rows)
    capture = read(text, interval_s=1e-3)
    assert [span.start for span in waveform(capture).spans] == [0, 20]
    assert times_of(capture.traces[0])[19:21].tolist() == pytest.approx([0.019, 0.030])
    gaps = next(n for n in capture.warnings if n.code == "gaps")
    assert "0.03 s" in gaps.text


def test_the_interval_counts_rows_of_uneven_stamps(read: Read) -> None:
    text = "Time (s),OUT (V)\n" + "".join(
        f"{i + 0.3 * (i % 3):.1f},{(i * 7) % 5}.5\n" for i in range(60)
    )
    assert isinstance(waveform(read(text)).time, StampedTime)
    capture = read(text, interval_s=1e-3)
    assert times_of(capture.traces[0])[-1] == pytest.approx(0.059)
    assert codes_of(capture) == ["interval-overruled"]


def test_the_interval_makes_an_assumed_unit_moot(read: Read) -> None:
    text = "Time,OUT (V)\n" + "".join(f"{i}.5,{i % 2}.5\n" for i in range(20))
    assert "assumed-time-unit" in codes_of(read(text))
    capture = read(text, interval_s=1.7e-3)
    assert "assumed-time-unit" not in codes_of(capture)
    assert "time_unit" not in {p.name for p in capture.structure}


def test_a_list_of_transitions_takes_no_interval(read: Read) -> None:
    assert isinstance(read(LIST).traces[0], LogicTrace)
    with pytest.raises(UsageError, match="list of transitions") as caught:
        read(LIST, interval_s=1e-3)
    assert caught.value.code == "option-idle"
    assert "--time-unit" in caught.value.hint
    assert isinstance(read(LIST, time_unit="ms").traces[0], LogicTrace)


def test_even_rows_that_change_each_time_are_samples_if_an_interval_is_given(read: Read) -> None:
    text = "Time (s),OUT (V)\n" + "".join(f"{i}.5,{i % 2}.5\n" for i in range(20))
    assert isinstance(read(text).traces[0], LogicTrace)
    assert step_s(read(text, interval_s=1e-3)) == 1e-3


def test_the_unit_given_wins_over_the_header(read: Read) -> None:
    capture = read(TWO_CLOCKS, time="1", time_unit="us")
    assert step_s(capture) == pytest.approx(5e-6)
    assert found(capture, "time_unit").evidence == "--time-unit"


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("Interval: 1 ms\nOUT (V)\n" + "4.75\n0.25\n" * 20, "no column gives time"),
        (
            "Time,OUT (V)\n" + "".join(f"2026-05-01T10:00:{i:02d}Z,{i % 2}.5\n" for i in range(40)),
            "calendar stamps",
        ),
        (
            "Interval: 1 ms\nTime (samples),OUT (V)\n"
            + "".join(f"{i},{i % 2}.5\n" for i in range(40)),
            "counts samples",
        ),
    ],
)
def test_a_unit_without_a_column_of_it_is_refused(read: Read, text: str, says: str) -> None:
    assert read(text).traces
    with pytest.raises(UsageError, match=says) as caught:
        read(text, time_unit="ms")
    assert caught.value.code == "option-idle"


def test_the_unit_given_wins_over_the_timescale_of_a_dump(read: Read) -> None:
    trace = read(DUMP, "capture.vcd", time_unit="ms").traces[0]
    assert isinstance(trace, LogicTrace)
    assert trace.times_s.tolist() == [0.005, 0.009, 0.015]


def test_the_rate_given_wins_over_that_of_a_sound_file(read: Read) -> None:
    capture = read(sound(), "capture.wav", interval_s=1 / 960)
    assert step_s(capture) == 1 / 960
    assert "interval-overruled" in codes_of(capture)


def test_arrays_take_time_unit_and_interval(tmp_path: Path) -> None:
    path = tmp_path / "capture.npz"
    np.savez(path, t_ms=np.arange(60.0), other=2 * np.arange(60.0), out=np.array(WAVE))
    assert step_s(read_capture(path)) == pytest.approx(1e-3)
    capture = read_capture(path, ReadOptions(time="other", time_unit="us"))
    assert step_s(capture) == pytest.approx(2e-6)
    assert step_s(read_capture(path, ReadOptions(time="2"))) == pytest.approx(2.0)
    counted = read_capture(path, ReadOptions(time="none", interval_s=3e-3))
    assert step_s(counted) == 3e-3
    with pytest.raises(UsageError, match="no array 'zeit'") as caught:
        read_capture(path, ReadOptions(time="zeit"))
    assert "1 t_ms, 2 other, 3 out, or none" in caught.value.hint
    with pytest.raises(UsageError, match="no array gives time"):
        read_capture(path, ReadOptions(time="none", interval_s=3e-3, time_unit="ms"))


@pytest.mark.parametrize("option", [{"time": "1"}, {"time_unit": "ms"}])
def test_our_own_arrays_state_their_time(tmp_path: Path, option: dict[str, str]) -> None:
    path = tmp_path / "capture.npz"
    np.savez(path, samples=np.array(WAVE), dt=1e-3)
    with pytest.raises(UsageError, match="state their own time"):
        read_capture(path, ReadOptions(**option))  # type: ignore[arg-type]
    assert step_s(read_capture(path, ReadOptions(interval_s=2e-3))) == 2e-3


@pytest.mark.parametrize(
    ("name", "content", "options", "says"),
    [
        ("capture.vcd", DUMP.encode(), {"decimal": ","}, "--decimal .* read as vcd"),
        ("capture.vcd", DUMP.encode(), {"interval_s": 1e-3}, "--interval or --rate .* vcd"),
        ("capture.vcd", DUMP.encode(), {"skip": 2}, "--skip .* vcd"),
        ("capture.wav", sound(), {"delimiter": ";"}, "--delimiter .* wav"),
        ("capture.wav", sound(), {"time": "1"}, "--time .* wav"),
        ("capture.wav", sound(), {"time_unit": "ms"}, "--time-unit .* wav"),
    ],
)
def test_an_option_without_a_use_is_refused_not_left_out(
    read: Read, name: str, content: bytes, options: dict[str, object], says: str
) -> None:
    with pytest.raises(UsageError, match=says) as caught:
        read(content, name, **options)
    assert caught.value.code == "option-idle"
    assert "--channel" in caught.value.hint


@pytest.mark.parametrize(
    ("options", "name"),
    [({"delimiter": ","}, "delimiter"), ({"decimal": "."}, "decimal")],
)
def test_what_the_user_settles_is_the_evidence(
    read: Read, options: dict[str, str], name: str
) -> None:
    assert found(read(ONE_CLOCK), name).sure == "measured"
    settled = found(read(ONE_CLOCK, **options), name)
    assert (settled.evidence, settled.sure) == (f"--{name}", "stated")


def test_each_point_says_how_sure_it_is(read: Read) -> None:
    told = read("Time (ms),OUT (V)\n" + "".join(f"{i}.5,{i % 3}.5\n" for i in range(20)))
    bare = read("Time,OUT\n" + "".join(f"{i}.5,{i % 3}.5\n" for i in range(20)))
    assert found(told, "time_unit").sure == "stated"
    assert found(told, "interval").sure == "measured"
    assert found(bare, "time_unit").sure == "assumed"
    assert found(bare, "volts").sure == "assumed"
    assert "volts" not in {p.name for p in told.structure}
    stated = read("Interval: 1 ms\nOUT (V)\n" + "4.75\n0.25\n" * 20)
    assert found(stated, "interval").sure == "stated"
    without = read("Interval: 0.001\nOUT (V)\n" + "4.75\n0.25\n" * 20)
    assert found(without, "interval").sure == "assumed"


def test_time_that_breaks_off_is_read_by_counting_its_rows(read: Read) -> None:
    text = "Time (s),OUT (V)\n" + "".join(
        f"{i if i < 3000 else 3000 + (7 * i) % 3000}.0,{i % 3}.5\n" for i in range(6000)
    )
    with pytest.raises(MalformedCaptureError, match="backwards"):
        read(text)
    assert waveform(read(text, time="none", interval_s=1.0)).samples.size == 6000
