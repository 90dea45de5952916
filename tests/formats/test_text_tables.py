"""Tables of numbers that are no capture are refused in one sentence, and say what is needed."""

from __future__ import annotations

import numpy as np
import pytest
from read_back import Read, codes_of
from written import DT_S, TIMES_S, US, VOLTS, N, S, V, W, is_wave, lines, rows

from benchtool.errors import AmbiguousStructureError, CaptureError

SWEPT = [f"{f:.3f}" for f in np.logspace(1, 6, 60)]
EVEN = [f"{100.0 * i:.1f}" for i in range(60)]
VALUES = [f"{-0.1 * i * i:.2f}" for i in range(60)]

SWEEPS = {
    "frequency response": "Frequency (Hz),Gain (dB)\n" + rows(SWEPT, VALUES),
    "frequency response in short": "freq,mag\n" + rows(SWEPT, VALUES),
    "frequency response in units alone": "Hz,CH1\n" + rows(EVEN, VALUES),
    "frequency response without names": rows(SWEPT, VALUES),
    "spectrum beside a rate": "Sample rate: 200 kHz\nFrequency (Hz),Level\n" + rows(EVEN, VALUES),
    "bins beside a rate": "Sample rate: 200 kHz\nBin,Level (dB)\n"
    + lines(lambda i: f"{i},{VALUES[i]}", 60),
    "voltage and current": "Vds,Ids\n" + rows(EVEN, VALUES),
    "temperature": "Temperature (degC),OUT (V)\n" + rows(EVEN, VALUES),
    "resistors and times": "R (kOhm),C (uF),T (s)\n"
    + lines(lambda i: f"{10 * i + 10},47,{0.33 * (i + 1):.2f}", 12),
    "capacitors and charging times": "C (uF),t_charge (s)\n"
    + lines(lambda i: f"{10 * i + 10},{0.5 * (i + 1):.2f}", 12),
    "histogram of periods": "Period (us),Count\n" + lines(lambda i: f"{300 + i},{i * i % 9}", 40),
    "histogram in bins": "Bin (ns),Hits\n" + lines(lambda i: f"{i},{i * i % 9}", 40),
    "histogram under a unit": "ns,hits\n" + lines(lambda i: f"{i},{i * i % 9}", 40),
    "periods that drift": "Cycle,Period (us)\n" + lines(lambda i: f"{i},{306 + 0.1 * i:.1f}", 40),
    "rise times": "Rise Time (ns),Overshoot (V)\n" + lines(lambda i: f"{30 + i},0.{i:02d}", 40),
    "stability": "tau (s),adev\n" + rows(SWEPT, VALUES),
    "numbered parts": "Part No,Resistance,Tolerance\n" + lines(lambda i: f"{1000 + i},{i},5", 40),
    "bill of materials": "Item,Qty,Price\n" + lines(lambda i: f"{i + 1},{1 + i % 4},0.{i:02d}", 40),
    "months": "Month,Max (degC),Rain (mm)\n" + lines(lambda i: f"{i + 1},{i % 7},{30 + i}", 12),
    "years": "Year,Jan,Feb\n" + lines(lambda i: f"{1950 + i},{i % 7}.1,{i % 5}.3", 60),
    "days": "Date,Max,Min\n" + lines(lambda i: f"2031-01-{i + 1:02d},{i % 7},{i % 5}", 31),
    "days as numbers": "DATE,MAX\n" + lines(lambda i: f"203101{i + 1:02d},{i % 7}", 31),
    "calibration": "Cal interval: 12 months\nPoint,Applied,Reading\n"
    + lines(lambda i: f"{i + 1},{0.5 * i:.1f},{0.5003 * i:.4f}", 11),
    "registers": "Address,Value\n" + lines(lambda i: f"0x{i:02X},0x{(i * 37) % 256:02X}", 32),
    "edges and times": "Edge,Time (s)\n" + lines(lambda i: f"{i},{S[i]}", 40),
    "sunrise": "Date,Sunrise,Sunset\n" + lines(lambda i: f"2031-01-{i + 1:02d},07:{i},17:{i}", 30),
    "axis without unit": "X,Y\n" + rows(EVEN, VALUES),
    "sweep at each time": "Time (s),Frequency (Hz),Power (dB)\n"
    + lines(lambda i: f"{i // 10 * 0.1:.1f},{i % 10 * 100},{-i % 10}", 100),
}


@pytest.mark.parametrize("text", SWEEPS.values(), ids=SWEEPS.keys())
def test_a_table_that_is_no_capture_is_refused(read: Read, text: str) -> None:
    with pytest.raises(CaptureError) as caught:
        read(text)
    assert caught.value.code in {"no-time", "no-values", "no-rows", "time-disorder"}
    assert "capture.csv" in caught.value.message
    assert caught.value.hint


def test_the_axis_of_a_table_is_named(read: Read) -> None:
    with pytest.raises(AmbiguousStructureError, match=r"swept over 'Frequency \(Hz\)'"):
        read(SWEEPS["frequency response"])


def test_a_table_is_read_when_the_user_says_which_column_is_time(read: Read) -> None:
    text = "Shaft,OUT (V)\n" + rows(US, V)
    with pytest.raises(AmbiguousStructureError):
        read(text)
    assert is_wave(read(text, time="Shaft", time_unit="us").traces[0], TIMES_S, VOLTS)


def test_an_axis_without_a_unit_is_time_if_the_user_gives_one(read: Read) -> None:
    text = "X,Y\n" + rows(US, V)
    with pytest.raises(AmbiguousStructureError) as caught:
        read(text)
    assert "--time-unit" in caught.value.hint
    assert is_wave(read(text, time_unit="us").traces[0], TIMES_S, VOLTS)


def test_an_axis_with_a_unit_is_time(read: Read) -> None:
    assert is_wave(read("X (us),Y (V)\n" + rows(US, V)).traces[0], TIMES_S, VOLTS)


@pytest.mark.parametrize("key", ["Channel", "Pin", "Sensor"])
def test_samples_of_several_channels_in_one_column(read: Read, key: str) -> None:
    text = f"Time (s),{key},Value (V)\n" + lines(lambda i: f"{S[i]},1,{V[i]}\n{S[i]},2,{W[i]}")
    with pytest.raises(AmbiguousStructureError, match="several channels"):
        read(text)


@pytest.mark.parametrize("limit", [1 << 20, 0])
def test_a_channel_that_changes_far_below_is_seen(read: Read, limit: int) -> None:
    block = "".join(rows(["OUT"] * N, S, V) for _ in range(20))
    text = "Channel,Time (s),Value (V)\n" + block + rows(["CAP"] * N, S, W)
    with pytest.raises(AmbiguousStructureError, match="several channels"):
        read(text, limit=limit)


def test_one_channel_named_in_every_row_is_read(read: Read) -> None:
    capture = read("Channel,Time (s),Value (V)\n" + rows(["OUT"] * N, S, V))
    assert is_wave(capture.traces[0], TIMES_S, VOLTS)


def test_frames_without_time_are_refused(read: Read) -> None:
    frame = "".join(f"{v}\n" for v in V)
    for between in ("\n", "# next frame\n", "Frame\n"):
        with pytest.raises(AmbiguousStructureError, match="frames of 240 rows"):
            read(f"Rate: 200 kS/s\nOUT (V)\n{frame}{between}{frame}{between}{frame}")


def test_a_remark_among_counted_rows_parts_no_frames(read: Read) -> None:
    frame = "".join(f"{v}\n" for v in V)
    capture = read(f"Rate: 200 kS/s\nOUT (V)\n{frame}# valve opened\n{frame}")
    assert capture.traces[0].samples.size == 2 * N  # type: ignore[union-attr]


def test_a_wrapped_channel_is_asked_about(read: Read) -> None:
    wrapped = "".join(",".join(V[i : i + 10]) + "\n" for i in range(0, N, 10))
    with pytest.raises(AmbiguousStructureError, match="wrapped"):
        read("Rate: 200 kS/s\n" + wrapped)


def test_channels_without_names_are_no_wrapped_one(read: Read) -> None:
    first, second, third = read("Rate: 200 kS/s\n" + rows(V, W, V)).traces
    assert is_wave(first, TIMES_S, VOLTS)
    assert second.channel == "column 2"
    assert third.time.dt_s == DT_S  # type: ignore[union-attr]


@pytest.mark.parametrize(
    "stamps",
    [[f"{0.4 * i:.3f}" for i in range(9)], [f"{1 + 0.25 * i:.3f}" for i in range(9)]],
    ids=["some below one", "all above one"],
)
def test_two_decimal_marks_in_one_file(read: Read, stamps: list[str]) -> None:
    text = "t (s);U (V)\n" + rows(stamps, ["4,75", "0,25", "4,85"] * 3, mark=";")
    with pytest.raises(AmbiguousStructureError, match="decimal"):
        read(text)


def test_a_fraction_behind_a_comma_that_delimits(read: Read) -> None:
    text = "Time,OUT (V)\n" + lines(lambda i: f"2031-03-02 03:12:00,{5 * i % 1000:03d},{V[i]}")
    with pytest.raises(AmbiguousStructureError, match="decimal comma"):
        read(text)


def test_columns_of_bits_beside_commas_are_states(read: Read) -> None:
    text = "# samplerate 200 kHz\n" + lines(lambda i: f"{i // 7 % 2},{i // 3 % 2}")
    capture = read(text)
    assert [t.unit for t in capture.traces] == ["1", "1"]  # type: ignore[union-attr]
    assert codes_of(capture) == []
