"""What a file does not say is refused with its option, or measured with a notice."""

from __future__ import annotations

import numpy as np
import pytest
from read_back import Read, codes_of, values_of

from benchtool.errors import (
    AmbiguousStructureError,
    MalformedCaptureError,
    UnknownStructureError,
)
from benchtool.model.capture import Waveform

COMMA_BOTH = "Time (s),OUT (V)\n" + "".join(
    f"0,{i:05d},{4 * (i % 2)},{25 + i % 3}\n" for i in range(30)
)


def test_no_time_and_no_interval_names_the_options(read: Read) -> None:
    with pytest.raises(AmbiguousStructureError, match="no time column") as caught:
        read("OUT (V)\n" + "4.75\n0.25\n" * 20)
    assert caught.value.code == "no-time"
    assert "--interval" in caught.value.hint
    assert "--rate" in caught.value.hint


def test_bare_counting_column_is_no_time(read: Read) -> None:
    with pytest.raises(AmbiguousStructureError) as caught:
        read("".join(f"{i},{4.75 if i % 9 > 4 else 0.25}\n" for i in range(30)))
    assert "--time-unit" in caught.value.hint


def test_bare_counting_column_is_time_if_the_user_says_so(read: Read) -> None:
    text = "".join(f"{i},{4.75 if i % 9 > 4 else 0.25}\n" for i in range(30))
    trace = read(text, time_unit="ms").traces[0]
    assert isinstance(trace, Waveform)
    assert trace.time.dt_s == pytest.approx(1e-3)  # type: ignore[union-attr]


def test_comma_as_delimiter_and_decimal_mark(read: Read) -> None:
    with pytest.raises(AmbiguousStructureError, match="commas") as caught:
        read(COMMA_BOTH)
    assert "--decimal" in caught.value.hint
    assert "--delimiter" in caught.value.hint


def test_comma_as_both_is_read_when_the_user_says_so(read: Read) -> None:
    capture = read(COMMA_BOTH, delimiter=",", decimal=",")
    assert values_of(capture.traces[0]) == pytest.approx(
        [4 * (i % 2) + (25 + i % 3) / 100 for i in range(30)]
    )


def test_comma_as_both_with_fractions_missing(read: Read) -> None:
    text = "Time (s),OUT (V)\n" + "".join(
        f"0,{i:02d},{'5' if i % 3 else '4,9'}\n" for i in range(30)
    )
    with pytest.raises(AmbiguousStructureError):
        read(text)


@pytest.mark.parametrize("cell", ["1,234", "2,500"])
def test_thousand_or_fraction(read: Read, cell: str) -> None:
    text = "time_us;OUT\n" + "".join(f"{5 * i};{cell if i % 2 else '3,300'}\n" for i in range(30))
    with pytest.raises(AmbiguousStructureError, match="thousand") as caught:
        read(text)
    assert "--decimal" in caught.value.hint


@pytest.mark.parametrize(("decimal", "first"), [(",", 3.3), (".", 3300.0)])
def test_thousand_or_fraction_settled_by_option(read: Read, decimal: str, first: float) -> None:
    text = "time_us;OUT (V)\n" + "".join(
        f"{5 * i};{'1,234' if i % 3 else '3,300'}\n" for i in range(30)
    )
    assert values_of(read(text, decimal=decimal).traces[0])[0] == pytest.approx(first)


def test_fraction_below_one_settles_the_comma(read: Read) -> None:
    text = "time_ms;OUT (V)\n" + "".join(
        f"0,{i:03d};{'1,234' if i % 3 else '3,300'}\n" for i in range(30)
    )
    assert values_of(read(text).traces[0])[:2] == pytest.approx([3.3, 1.234])


def test_two_halves_with_different_delimiters(read: Read) -> None:
    half = "".join(f"{i}.5,{i % 2}.5\n" for i in range(20))
    with pytest.raises(AmbiguousStructureError) as caught:
        read(half + half.replace(",", ";"))
    assert "--delimiter" in caught.value.hint


def test_two_stated_intervals_without_a_time_column(read: Read) -> None:
    with pytest.raises(AmbiguousStructureError, match="two sample intervals") as caught:
        read("Sample interval: 5 us\nRate: 100 kS/s\nOUT (V)\n" + "4.75\n0.25\n" * 20)
    assert "--interval" in caught.value.hint


def test_unit_of_time_that_is_none(read: Read) -> None:
    with pytest.raises(AmbiguousStructureError, match="div") as caught:
        read("Time (div),OUT (V)\n" + "".join(f"{i}.5,{i % 2}.5\n" for i in range(20)))
    assert "--time-unit" in caught.value.hint


def test_unknown_unit_option(read: Read) -> None:
    with pytest.raises(AmbiguousStructureError, match="fortnight"):
        read(
            "Time,OUT (V)\n" + "".join(f"{i}.5,{i % 2}.5\n" for i in range(20)),
            time_unit="fortnight",
        )


def test_time_per_division_is_no_interval(read: Read) -> None:
    with pytest.raises(AmbiguousStructureError):
        read("Horizontal scale: 1 ms/div\nTrigger delay: 2 ms\nOUT (V)\n" + "4.75\n0.25\n" * 20)


def test_time_without_a_unit_is_an_assumption(read: Read) -> None:
    capture = read("Time,OUT (V)\n" + "".join(f"{i}.5,{i % 2}.5\n" for i in range(20)))
    assert "assumed-time-unit" in codes_of(capture)
    assert "--time-unit" in capture.warnings[0].text


def test_ragged_rows_and_words_are_counted_with_their_line(read: Read) -> None:
    lines = [f"{i * 0.005:.3f},{0.1 * (i % 9):.1f}" for i in range(100)]
    lines[40], lines[60], lines[80] = "0.200,abc", "0.300", "0.400,1.0,2.0,3.0"
    capture = read("time_s,OUT (V)\n" + "\n".join(lines) + "\n")
    texts = {n.code: n.text for n in capture.warnings}
    assert set(texts) == {"rows-skipped", "values-missing", "gaps"}
    assert texts["rows-skipped"].startswith("2 row(s)")
    assert "line 62" in texts["rows-skipped"]
    assert texts["values-missing"].startswith("1 cells")
    assert "line 42" in texts["values-missing"]


def test_missing_values_stay_in_their_place(read: Read) -> None:
    lines = [f"{i * 0.005:.3f},{'NaN' if i in (7, 8) else 0.1 * i}" for i in range(50)]
    capture = read("time_s,OUT (V)\n" + "\n".join(lines) + "\n")
    values = values_of(capture.traces[0])
    assert np.flatnonzero(np.isnan(values)).tolist() == [7, 8]
    assert codes_of(capture) == ["values-missing"]


def test_bad_rows_keep_their_place_where_rows_are_the_clock(read: Read) -> None:
    lines = [f"{0.1 * i:.1f}" for i in range(50)]
    lines[20] = "lost"
    capture = read("Interval: 1 ms\nOUT (V)\n" + "\n".join(lines) + "\n")
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert trace.samples.size == 50
    assert np.flatnonzero(np.isnan(values_of(trace))).tolist() == [20]
    assert codes_of(capture) == ["rows-skipped"]


@pytest.mark.parametrize("end", ["0.495", "0.495,", "0.495,0", "0.495,0.", "0.4", "0"])
def test_cut_in_mid_line_is_read_to_the_last_whole_row(read: Read, end: str) -> None:
    text = "time_s,OUT (V)\n" + "".join(f"{i * 0.005:.3f},{0.1 * (i % 9):.1f}\n" for i in range(99))
    capture = read(text + end)
    trace = capture.traces[0]
    assert isinstance(trace, Waveform)
    assert trace.samples.size == 99
    assert codes_of(capture) == ["file-cut"]


def test_whole_last_line_without_its_line_end_is_kept(read: Read) -> None:
    text = "time_s,OUT (V)\n" + "".join(f"{i * 0.005:.3f},{0.1 * (i % 9):.1f}\n" for i in range(99))
    assert read(text + "0.495,0.3").traces[0].samples.size == 100  # type: ignore[union-attr]


def test_zeros_after_a_power_cut(read: Read) -> None:
    text = "time_s,OUT (V)\n" + "".join(f"{i * 0.005:.3f},{0.1 * (i % 9):.1f}\n" for i in range(99))
    capture = read(text.encode() + bytes(700))
    assert capture.traces[0].samples.size == 99  # type: ignore[union-attr]


def test_nobody_recognises_noise(read: Read) -> None:
    noise = np.random.default_rng(5).integers(0, 256, 4096).astype(np.uint8).tobytes()
    with pytest.raises(UnknownStructureError, match="text, vcd, npz, wav") as caught:
        read(noise)
    assert "--format" in caught.value.hint


@pytest.mark.parametrize(
    ("text", "code"),
    [
        ("", "empty-file"),
        ("  \n\n \n", "empty-file"),
        ("time_s,OUT (V)\n", "no-rows"),
        ("This folder holds the captures\nof the misting controller.\n", "no-rows"),
        ("time_s,OUT (V)\n0.000,4.75\n", "one-row"),
        ("time_s,OUT (V)\n" + "".join(f"0.{i:03d},NaN\n" for i in range(30)), "no-values"),
        ("time_s\n" + "".join(f"0.{i:03d}\n" for i in range(30)), "no-values"),
        ("time_s,note\n" + "".join(f"0.{i:03d},wet leaf\n" for i in range(30)), "no-rows"),
        (
            "time_s,OUT (V)\n"
            + "".join(f"0.{(37 * i) % 1000:03d},{i % 2}.0\n" for i in range(300)),
            "time-disorder",
        ),
        (
            "time_s,OUT (V)\n" + "".join(f"{9 - i / 10:.1f},{i % 2}.5\n" for i in range(60)),
            "time-disorder",
        ),
    ],
)
def test_each_way_to_hold_nothing_has_its_code(read: Read, text: str, code: str) -> None:
    with pytest.raises(MalformedCaptureError) as caught:
        read(text)
    assert caught.value.code == code
    assert caught.value.hint
    assert "capture.csv" in caught.value.message


def test_mostly_unreadable_rows_are_an_error(read: Read) -> None:
    lines = [
        f"{i * 0.005:.3f},{0.1 * (i % 9):.1f}" if i % 2 else "lost in transmission"
        for i in range(600)
    ]
    with pytest.raises(MalformedCaptureError) as caught:
        read("time_s,OUT (V)\n" + "\n".join(lines) + "\n")
    assert caught.value.code == "rows-unreadable"
    assert caught.value.line is not None
    assert lines[caught.value.line - 2] == "lost in transmission"
