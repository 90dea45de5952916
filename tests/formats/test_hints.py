"""Every option that a refusal names does lead on."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest
from read_back import Read, values_of

from benchtool.errors import AmbiguousStructureError, BenchtoolError, MalformedCaptureError
from benchtool.formats import read_capture
from benchtool.model.arrays import FloatArray
from benchtool.model.capture import Capture, LogicTrace, ReadOptions

OPTION = re.compile(r"--[a-z-]+")
PAIR = re.compile(r"--delimiter (\S+) --decimal (\S) \(")
ROWS = "".join(f"{i}.5,{i % 2}.5\n" for i in range(20))
BOTH = "Time (s),OUT (V)\n" + "".join(f"0,{i:05d},{4 * (i % 2)},{25 + i % 3}\n" for i in range(30))
MISSING = "Time (s),OUT (V)\n" + "".join(
    f"0,{i:02d},{'5' if i % 3 else '4,9'}\n" for i in range(30)
)
THOUSANDS = "time_us;OUT\n" + "".join(
    f"{5 * i};{'1,234' if i % 2 else '3,300'}\n" for i in range(30)
)
COUNTER = "".join(f"{i},{4.75 if i % 9 > 4 else 0.25}\n" for i in range(30))
RUNS_BACK = "Time (s),OUT (V)\n" + "".join(f"{9 - i / 10:.1f},{i % 3}.5\n" for i in range(60))
BREAKS_OFF = "Time (s),OUT (V)\n" + "".join(
    f"{i if i < 3000 else 3000 + (7 * i) % 3000}.0,{i % 3}.5\n" for i in range(6000)
)

REFUSED: dict[str, tuple[str, dict[str, dict[str, object]]]] = {
    "no time": (
        "OUT (V)\n" + "4.75\n0.25\n" * 20,
        {
            "--interval (such as 5us)": {"interval_s": 5e-6},
            "--rate (such as 200k)": {"interval_s": 1 / 200e3},
        },
    ),
    "a bare counter": (
        COUNTER,
        {
            "--interval (such as 5us)": {"interval_s": 5e-6},
            "--rate (such as 200k)": {"interval_s": 1 / 200e3},
            "--time 1 and its unit with --time-unit": {"time": "1", "time_unit": "ms"},
        },
    ),
    "two clocks that differ": (
        "Time (ms),Elapsed (us),OUT (V)\n"
        + "".join(f"{5 * i}.0,{7 * i}.0,{i % 3}.5\n" for i in range(60)),
        {"--time": {"time": "2"}},
    ),
    "a delimiter that is not tried": (
        "Time (s):OUT (V)\n" + ROWS.replace(",", ":"),
        {"--delimiter ':'": {"delimiter": ":"}},
    ),
    "prose": ("This folder holds the captures\nof the misting controller: see there.\n", {}),
    "mostly no rows": (
        "time_s,OUT (V)\n"
        + "".join(f"{i * 0.005:.3f},{i % 9}.5\n" if i % 2 else "lost\n" for i in range(600)),
        {},
    ),
    "thousand or fraction": (
        THOUSANDS,
        {
            "--decimal , (a fraction)": {"decimal": ","},
            "--decimal . (thousands)": {"decimal": "."},
        },
    ),
    "two intervals": (
        "Sample interval: 5 us\nRate: 100 kS/s\nOUT (V)\n" + "4.75\n0.25\n" * 20,
        {"--interval": {"interval_s": 5e-6}},
    ),
    "whole numbers without a unit": (
        "time,OUT (V)\n" + "".join(f"{5 * i},{i % 3}.5\n" for i in range(60)),
        {
            "--time-unit s, ms, us or ns": {"time_unit": "us"},
            "--time none and --interval": {"time": "none", "interval_s": 1e-3},
        },
    ),
    "a unit that is none": (
        "Time (div),OUT (V)\n" + ROWS,
        {"--time-unit s, ms, us or ns": {"time_unit": "us"}},
    ),
    "time per division": (
        "Horizontal scale: 1 ms/div\nOUT (V)\n" + "4.75\n0.25\n" * 20,
        {
            "--interval (such as 5us)": {"interval_s": 5e-6},
            "--rate (such as 200k)": {"interval_s": 1 / 200e3},
        },
    ),
    "time in no order": (RUNS_BACK, {"--interval": {"interval_s": 1e-3}}),
    "time that loses its order": (
        BREAKS_OFF,
        {"--time none and --interval": {"time": "none", "interval_s": 1e-3}},
    ),
    "transitions in no order": (
        "time_s,OUT\n" + "".join(f"{(7 * i) % 30}.0,{i % 2}\n" for i in range(30)),
        {},
    ),
}
EACH = pytest.mark.parametrize("name", REFUSED)


def refuse(read: Read, name: str) -> BenchtoolError:
    with pytest.raises(BenchtoolError) as caught:
        read(REFUSED[name][0])
    return caught.value


@EACH
def test_each_way_that_a_hint_names_leads_to_a_reading(read: Read, name: str) -> None:
    hint = refuse(read, name).hint
    for words, options in REFUSED[name][1].items():
        assert words in hint
        assert read(REFUSED[name][0], **options).traces


@EACH
def test_no_hint_names_an_option_that_is_not_tried_here(read: Read, name: str) -> None:
    named = OPTION.findall(refuse(read, name).hint)
    assert sorted(named) == sorted(OPTION.findall(" ".join(REFUSED[name][1])))


TRIED = {
    "a comma twice": BOTH,
    "a comma twice, and fractions missing": MISSING,
    "one column with a decimal comma": "Interval: 1 ms\nOUT (V)\n" + "0,05\n4,75\n" * 20,
    "two delimiters, each half": ROWS + ROWS.replace(",", ";"),
}


@pytest.mark.parametrize("name", TRIED)
def test_each_pair_of_marks_that_a_hint_names_was_tried(read: Read, name: str) -> None:
    """A way may lead to the next question, about the time between the rows; it is answered."""
    with pytest.raises(BenchtoolError) as caught:
        read(TRIED[name])
    ways = PAIR.findall(caught.value.hint)
    assert 2 * len(ways) == len(OPTION.findall(caught.value.hint))
    assert ways or "No option" in caught.value.hint
    for delimiter, decimal in ways:
        options = {"delimiter": delimiter.strip("'"), "decimal": decimal}
        assert _read_on(read, TRIED[name], options).traces


NEXT: dict[str, dict[str, object]] = {
    "no-time": {"interval_s": 1e-3},
    "no-time-unit": {"time_unit": "ms"},
}


def _read_on(read: Read, text: str, options: dict[str, str]) -> Capture:
    try:
        return read(text, **options)
    except AmbiguousStructureError as next_question:
        code = next_question.code
    return read(text, **options, **NEXT[code])


def test_a_way_that_leads_nowhere_is_not_offered(read: Read) -> None:
    """Both commas of a row cannot be a decimal mark where the rows have three cells."""
    with pytest.raises(BenchtoolError) as caught:
        read(BOTH)
    assert PAIR.findall(caught.value.hint) == [(",", "."), (",", ",")]
    with pytest.raises(MalformedCaptureError):
        read(BOTH, delimiter="none", decimal=",")


def test_what_the_ways_mean_differs(read: Read) -> None:
    """Each way out of the two commas gives its own numbers."""
    first = read(BOTH, delimiter=",", decimal=".", interval_s=1e-3).traces[-1]
    second = read(BOTH, delimiter=",", decimal=",").traces[-1]
    assert values_of(first)[:3].tolist() == [25.0, 26.0, 27.0]
    assert values_of(second)[:3].tolist() == [0.25, 4.26, 0.27]


@pytest.mark.parametrize(
    ("options", "says"),
    [
        ({"delimiter": ";"}, "Leave out --delimiter:"),
        ({"delimiter": "|", "decimal": ","}, "Leave out --delimiter and --decimal:"),
    ],
)
def test_marks_that_spoil_a_sound_file_are_to_be_left_out(
    read: Read, options: dict[str, str], says: str
) -> None:
    assert read("Time (s),OUT (V)\n" + ROWS).traces
    with pytest.raises(MalformedCaptureError) as caught:
        read("Time (s),OUT (V)\n" + ROWS, **options)
    assert caught.value.hint.startswith(says)


@pytest.mark.parametrize(
    ("suffix", "array", "options"),
    [
        (".npy", np.tile([0.0, 5.0, 5.0], 30), {"interval_s": 1e-3}),
        (
            ".npy",
            np.column_stack([np.roll(np.arange(90.0), 45) % 7, np.tile([0.0, 5.0, 5.0], 30)]),
            {"interval_s": 1e-3},
        ),
    ],
    ids=["one array", "a table whose first column does not rise"],
)
def test_arrays_without_time_are_read_with_the_interval(
    tmp_path: Path, suffix: str, array: FloatArray, options: dict[str, float]
) -> None:
    path = tmp_path / f"capture{suffix}"
    np.save(path, array)
    with pytest.raises(BenchtoolError) as caught:
        read_capture(path)
    assert "--interval (such as 5us)" in caught.value.hint
    assert read_capture(path, ReadOptions(**options)).traces  # type: ignore[arg-type]


def test_a_dump_without_timescale_is_read_with_the_unit(read: Read) -> None:
    dump = "$var wire 1 ! OUT $end\n$enddefinitions $end\n#0\n0!\n#5\n1!\n#9\n0!\n"
    with pytest.raises(BenchtoolError) as caught:
        read(dump, "capture.vcd")
    assert "--time-unit s, ms, us, ns, ps or fs" in caught.value.hint
    trace = read(dump, "capture.vcd", time_unit="ms").traces[0]
    assert isinstance(trace, LogicTrace)
    assert trace.times_s.tolist() == [0.005, 0.009]
