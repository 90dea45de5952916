"""What is stacked above or under a record: summaries, spectra, other channels, more segments."""

from __future__ import annotations

import numpy as np
import pytest
from read_back import Read, codes_of
from written import (
    EDGES_S,
    HIGH_AFTER,
    MS,
    TIMES_S,
    VOLTS,
    E,
    N,
    S,
    V,
    W,
    X,
    is_list,
    is_wave,
    lines,
    rows,
)

HEAD = "Time (s),OUT (V)\n"
BODY = rows(S, V)
SPECTRUM = lines(lambda i: f"{i * 333.3:.1f},{-20 - i / 10:.1f}", 150)

OTHERS = {
    "spectrum": "\nFrequency (Hz),Magnitude (dB)\n" + SPECTRUM,
    "spectrum without a blank line": "Frequency (Hz),Magnitude (dB)\n" + SPECTRUM,
    "spectrum under a comment": "# Frequency (Hz),Magnitude (dB)\n" + SPECTRUM,
    "spectrum with a row of units": "Frequency,Magnitude\nHz,dB\n" + SPECTRUM,
    "histogram": "\nBin (V),Count\n" + lines(lambda i: f"0.{i:02d},{i % 17}", 90),
    "table of three columns": "\nCycle,High (us),Low (us)\n"
    + lines(lambda i: f"{i},17{i % 9}.1,13{i % 9}.2", 150),
    "small table of three columns": "\nCycle,High (us),Low (us)\n1,175.1,131.2\n2,175.2,131.1\n",
    "another channel": "\nTime (s),NODE (V)\n" + rows(S, W),
    "the same names in another unit": "\nTime (ms),OUT (V)\n" + rows(MS, V),
}
FOOTERS = {
    "measurements": "\nMeasurement,Value,Unit\nFrequency,3262.6,Hz\nVpp,4.55,V\n",
    "measurements in two columns": "\nFrequency (Hz),3262.6\nPeriod (us),306.5\n",
    "events": "\nEvents\n12:00:01,valve opened\n12:00:05,valve closed\n",
    "empty rows": ",\n" * 150,
}


@pytest.mark.parametrize("limit", [1 << 20, 0], ids=["in memory", "in blocks"])
@pytest.mark.parametrize("other", OTHERS.values(), ids=OTHERS.keys())
def test_another_table_below_is_left_out_and_said(read: Read, other: str, limit: int) -> None:
    capture = read(HEAD + BODY + other, limit=limit)
    assert len(capture.traces) == 1
    assert is_wave(capture.traces[0], TIMES_S, VOLTS)
    assert codes_of(capture) == ["other-table"]


@pytest.mark.parametrize("limit", [1 << 20, 0], ids=["in memory", "in blocks"])
def test_another_table_far_below_is_seen(read: Read, limit: int) -> None:
    n = 6000  # rows beyond the head of the file
    body = lines(lambda i: f"{i * 5e-6:.6f},{V[i % N]}", n)
    capture = read(HEAD + body + OTHERS["histogram"], limit=limit)
    assert is_wave(capture.traces[0], np.arange(n) * 5e-6, np.resize(VOLTS, n))
    assert codes_of(capture) == ["other-table"]


@pytest.mark.parametrize("footer", FOOTERS.values(), ids=FOOTERS.keys())
def test_a_footer_is_no_row(read: Read, footer: str) -> None:
    capture = read(HEAD + BODY + footer)
    assert is_wave(capture.traces[0], TIMES_S, VOLTS)
    assert "gaps" not in codes_of(capture)


@pytest.mark.parametrize(
    "above",
    [
        "Measurement,Mean,Min,Max\nFrequency,3262,3260,3265\n\n",
        "Cursor,1,2\nX,0.001,0.002\nY,4.7,0.2\n\n",
        "1,0.001,4.7\n2,0.002,0.2\n\n",
        "Cursor time,Cursor volt\n0.001,4.7\n0.002,0.2\n\n",
    ],
)
def test_a_small_table_above_is_passed_over(read: Read, above: str) -> None:
    capture = read(above + HEAD + BODY)
    assert [t.channel for t in capture.traces] == ["OUT"]
    assert is_wave(capture.traces[0], TIMES_S, VOLTS)


@pytest.mark.parametrize("between", ["", "\n", "Segment 2\n", "Trigger,12:00:02\n"])
def test_the_same_header_again_heads_a_segment(read: Read, between: str) -> None:
    first = "Trigger,12:00:01\n" if between.startswith("Trigger") else ""
    capture = read(first + HEAD + BODY + between + HEAD + BODY)
    assert [(s.start, s.stop) for s in capture.traces[0].spans] == [(0, N), (N, 2 * N)]  # type: ignore[union-attr]
    assert "other-table" not in codes_of(capture)


def test_a_title_that_names_another_channel_ends_the_record(read: Read) -> None:
    head = "Time (s),Volt (V)\n"
    capture = read(f"CH1\n{head}{BODY}\nCH2\n{head}{rows(S, W)}")
    assert is_wave(capture.traces[0], TIMES_S, VOLTS)
    assert codes_of(capture) == ["other-table"]


def test_a_table_under_a_list_of_transitions(read: Read) -> None:
    pulses = "\nPulse,Width (us)\n" + lines(lambda i: f"{i},{175 + i}.1", 30)
    capture = read("Time (s),State\n" + rows(E, X) + pulses)
    assert is_list(capture.traces[0], EDGES_S, HIGH_AFTER)
    assert codes_of(capture) == ["other-table"]


def test_a_word_in_a_single_column_is_a_lost_row(read: Read) -> None:
    capture = read("Interval: 1 ms\nOUT (V)\n" + "0.1\n" * 20 + "lost\n" + "0.2\n" * 29)
    assert capture.traces[0].samples.size == 50  # type: ignore[union-attr]
