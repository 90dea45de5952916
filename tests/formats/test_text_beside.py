"""What stands beside the data: metadata, start and increment, other channels with their times."""

from __future__ import annotations

import numpy as np
import pytest
from read_back import Read, codes_of
from written import DT_S, MS, OTHER, TIMES_S, US, VOLTS, N, S, V, W, comma, is_wave, lines, rows

from benchtool.errors import AmbiguousStructureError

META = ["Length,240,", "Sample Interval,5.0e-06,s", "Source,CH1,", "Vertical Units,V,"]
RIGHT = ["Rate,200000", "Coupling,DC", "Mean,2.8"]


def meta(i: int) -> str:
    return META[i] if i < len(META) else ",,"


def right(i: int) -> str:
    return RIGHT[i] if i < len(RIGHT) else ","


ONE_WAVE = {
    "metadata left": lines(lambda i: f"{meta(i)},{S[i]},{V[i]}"),
    "metadata left of values alone": lines(lambda i: f"{meta(i)},{V[i]}"),
    "metadata left of a running number": lines(lambda i: f"{meta(i)},{i},{V[i]}"),
    "named metadata right": "Time (s),OUT (V),,Key,Value\n"
    + lines(lambda i: f"{S[i]},{V[i]},,{right(i)}"),
    "metadata right of the first rows only": "Time (s),OUT (V)\n"
    + lines(lambda i: f"{S[i]},{V[i]}" + (f",,{RIGHT[i]}" if i < len(RIGHT) else "")),
    "board name in every row": "Board,Temp (degC),Time (s),OUT (V)\n"
    + lines(lambda i: f"GH-MV,25.1,{S[i]},{V[i]}"),
    "board number in every row": "Board,Serial,t_ms,OUT_V\n"
    + lines(lambda i: f"GH-MV,123,{MS[i]},{V[i]}"),
    "start and increment below the names": "X,OUT,Start,Increment\nSequence,Volt,-1e-3,5e-6\n"
    + lines(lambda i: f"{i},{V[i]}"),
    "start and increment in the first row": "X,OUT,Start,Increment\n"
    + lines(lambda i: f"{i},{V[i]}" + (",-1e-3,5e-6" if i == 0 else ",,")),
    "start and increment with units": "X,OUT (V),Start (ms),Increment (us)\n"
    + lines(lambda i: f"{i},{V[i]}" + (",-1,5" if i == 0 else ",,")),
    "start and increment, and one column": "OUT,Start,Increment\nVolt,-1e-3,5e-6\n"
    + lines(lambda i: V[i]),
    "increment by channel, all alike": "Delta_X\t5.0E-6\t5.0E-6\nX_Value\tOUT\tNODE\n"
    + lines(lambda i: f"\t{V[i]}\t{W[i]}"),
    "title above the rows": "Horizontal Units,S,\nMode,Detail,\nWaveform Data,\n"
    + lines(lambda i: f"{S[i]},{V[i]},"),
}


@pytest.mark.parametrize("text", ONE_WAVE.values(), ids=ONE_WAVE.keys())
def test_what_stands_beside_is_no_data(read: Read, text: str) -> None:
    capture = read(text)
    assert is_wave(capture.traces[-1 if "Board" in text else 0], TIMES_S, VOLTS)
    assert not {"interval-differs", "rows-skipped", "gaps"} & set(codes_of(capture))


def test_metadata_beside_two_channels(read: Read) -> None:
    text = lines(lambda i: f"{meta(i)},{S[i]},{V[i]},,{meta(i)},{S[i]},{W[i]}")
    first, second = read(text).traces
    assert is_wave(first, TIMES_S, VOLTS)
    assert is_wave(second, TIMES_S, OTHER)


def test_increments_that_differ_by_channel_are_asked_about(read: Read) -> None:
    with pytest.raises(AmbiguousStructureError, match="two sample intervals"):
        read("dt (s),5e-6,1e-5\nA (V),B (V)\n" + rows(V, W))


@pytest.mark.parametrize(("n_first", "n_second"), [(40, N), (N, 20), (N, 150), (60, N)])
@pytest.mark.parametrize("filled", [True, False])
def test_pairs_of_different_length(read: Read, n_first: int, n_second: int, filled: bool) -> None:
    def row(i: int) -> str:
        first = f"{2 * TIMES_S[i]:.6f},{W[i]}" if i < n_first else ","
        second = f",{S[i]},{V[i]}" if i < n_second else (",," if filled or n_first < N else "")
        return first + second

    first, second = read("T1 (s),A (V),T2 (s),B (V)\n" + lines(row)).traces
    assert is_wave(first, 2 * TIMES_S[:n_first], OTHER[:n_first])
    assert is_wave(second, TIMES_S[:n_second], VOLTS[:n_second])


def test_pairs_with_a_counter_each_and_a_gap_between(read: Read) -> None:
    text = "#,t1 (us),A,,#,t2 (us),B\n" + lines(lambda i: f"{i},{US[i]},{V[i]},,{i},{US[i]},{W[i]}")
    first, second = read(text).traces
    assert is_wave(first, TIMES_S, VOLTS)
    assert is_wave(second, TIMES_S, OTHER)


def test_group_names_that_look_like_units(read: Read) -> None:
    text = "A,,,V,,\nt (s),U,,t (s),U,\n" + lines(lambda i: f"{S[i]},{V[i]},,{S[i]},{W[i]},")
    capture = read(text)
    assert [t.channel for t in capture.traces] == ["A U", "V U"]
    assert is_wave(capture.traces[0], TIMES_S, VOLTS)


def test_two_times_side_by_side_that_differ_are_asked_about(read: Read) -> None:
    text = "t1 (s),t2 (s),A (V),B (V)\n" + lines(
        lambda i: f"{S[i]},{2 * TIMES_S[i]:.6f},{V[i]},{W[i]}"
    )
    with pytest.raises(AmbiguousStructureError, match="may belong to the time") as caught:
        read(text)
    assert "--time" in caught.value.hint
    assert is_wave(read(text, time="t1").traces[0], TIMES_S, VOLTS)


def test_the_same_time_in_two_units_is_one(read: Read) -> None:
    text = "Time (s),Elapsed (us),OUT (V)\n" + rows(S, US, V)
    assert is_wave(read(text).traces[0], TIMES_S, VOLTS)


def test_least_and_greatest_in_two_columns(read: Read) -> None:
    text = "t_ms;U_min;U_max\n" + rows(comma(MS), comma(V), comma(W), mark=";")
    low, high = read(text).traces
    assert is_wave(low, TIMES_S, VOLTS)
    assert is_wave(high, TIMES_S, OTHER)


@pytest.mark.parametrize("limit", [1 << 20, 0], ids=["in memory", "in blocks"])
def test_two_samples_a_stamp_are_an_envelope(read: Read, limit: int) -> None:
    text = "Time (s),OUT (V)\n" + lines(
        lambda i: f"{S[i]},{VOLTS[i] - 0.02:.2f}\n{S[i]},{VOLTS[i] + 0.02:.2f}"
    )
    capture = read(text, limit=limit)
    assert codes_of(capture) == ["envelope"]
    trace = capture.traces[0]
    assert is_wave(trace, TIMES_S, VOLTS)
    part = np.concatenate(list(trace.samples.blocks(10, 20)))  # type: ignore[union-attr]
    assert part == pytest.approx(VOLTS[10:20])
    assert trace.time.dt_s == pytest.approx(DT_S)  # type: ignore[union-attr]


def test_a_slow_channel_in_few_rows_does_not_hide_the_others(read: Read) -> None:
    text = "Time (s),OUT (V),Temp (degC)\n" + lines(
        lambda i: f"{S[i]},{V[i]},{'21.5' if i % 50 == 0 else ''}"
    )
    assert is_wave(read(text).traces[0], TIMES_S, VOLTS)


def test_a_current_named_by_its_letter_is_no_counter(read: Read) -> None:
    capture = read("Zeit [s],U [V],I [mA]\n" + rows(S, V, W))
    assert [t.channel for t in capture.traces] == ["U", "I"]
    assert is_wave(capture.traces[1], TIMES_S, OTHER)
