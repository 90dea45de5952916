"""The corpus of damaged files: one small file a fault, named for it.

Each gives one clear error with its code, or a capture with a counted notice.
"""

from __future__ import annotations

import contextlib
import pickle
import subprocess
import sys
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from read_back import codes_of

from benchtool.errors import (
    AmbiguousStructureError,
    BenchtoolError,
    CaptureError,
    MalformedCaptureError,
    UnknownStructureError,
)
from benchtool.formats import read_capture
from benchtool.model.capture import StampedTime, Waveform

CORPUS = Path(__file__).parents[1] / "malformed"

REFUSED: dict[str, tuple[type[CaptureError], str]] = {
    "all_nan.csv": (MalformedCaptureError, "no-values"),
    "arrays_of_two_lengths.npz": (MalformedCaptureError, "malformed-capture"),
    "bare_counter_for_time.csv": (AmbiguousStructureError, "no-time"),
    "binary_noise.csv": (UnknownStructureError, "unknown-structure"),
    "blank_lines_only.csv": (MalformedCaptureError, "empty-file"),
    "cut.npz": (MalformedCaptureError, "malformed-capture"),
    "cut_in_the_gz_header.csv.gz": (MalformedCaptureError, "empty-file"),
    "decimal_comma_with_comma_delimiter.csv": (AmbiguousStructureError, "ambiguous-structure"),
    "empty.csv": (MalformedCaptureError, "empty-file"),
    "foreign_word.vcd": (MalformedCaptureError, "malformed-capture"),
    "gz_of_nothing.csv.gz": (MalformedCaptureError, "empty-file"),
    "header_cut.vcd": (MalformedCaptureError, "header-cut"),
    "header_cut.wav": (MalformedCaptureError, "header-cut"),
    "header_only.csv": (MalformedCaptureError, "no-rows"),
    "mostly_unreadable_rows.csv": (MalformedCaptureError, "rows-unreadable"),
    "no_changes.vcd": (MalformedCaptureError, "no-values"),
    "no_time_and_no_interval.csv": (AmbiguousStructureError, "no-time"),
    "no_time_and_no_interval.npz": (AmbiguousStructureError, "no-time"),
    "no_timescale.vcd": (AmbiguousStructureError, "no-timescale"),
    "odd_timescale.vcd": (MalformedCaptureError, "malformed-capture"),
    "one_row.csv": (MalformedCaptureError, "one-row"),
    "pickled.npy": (MalformedCaptureError, "pickled"),
    "states_that_do_not_change.npz": (MalformedCaptureError, "malformed-capture"),
    "times_all_subnormal.csv": (MalformedCaptureError, "time-disorder"),
    "transitions_outside_the_record.npz": (MalformedCaptureError, "malformed-capture"),
    "values_all_overflow.csv": (MalformedCaptureError, "no-values"),
    "picture_named_csv.csv": (UnknownStructureError, "unknown-structure"),
    "prose.csv": (MalformedCaptureError, "no-rows"),
    "thousand_or_fraction.csv": (AmbiguousStructureError, "ambiguous-structure"),
    "time_column_only.csv": (MalformedCaptureError, "no-values"),
    "time_in_divisions.csv": (AmbiguousStructureError, "ambiguous-structure"),
    "time_in_no_order.csv": (MalformedCaptureError, "time-disorder"),
    "time_runs_backwards.csv": (MalformedCaptureError, "time-disorder"),
    "time_runs_backwards.vcd": (MalformedCaptureError, "time-disorder"),
    "two_delimiters.csv": (AmbiguousStructureError, "ambiguous-structure"),
    "two_intervals_stated.csv": (AmbiguousStructureError, "ambiguous-structure"),
    "unknown_coding.wav": (MalformedCaptureError, "malformed-capture"),
    "words_for_values.csv": (MalformedCaptureError, "no-rows"),
}

READ: dict[str, tuple[list[str], int]] = {
    "archive_with_notes.npz": (["assumed-volts"], 40),
    "cut_gz.csv.gz": (["file-cut", "file-cut"], 250),
    "cut_in_a_change.vcd": (["file-cut"], 0),
    "cut_in_mid_line.csv": (["file-cut"], 60),
    "duplicated_times.csv": (["repeated-stamps"], 60),
    "flat_line.csv": ([], 60),
    "integers_with_a_row_lost.csv": (["gaps", "rows-skipped"], 59),
    "lost_rows.csv": (["gaps"], 55),
    "one_edge.csv": ([], 60),
    "one_overflow.csv": (["values-missing"], 60),
    "overflow_before_the_signal.csv": (["values-missing"], 160),
    "ragged_rows.csv": (["gaps", "rows-skipped"], 58),
    "shorter_than_its_header.wav": (["assumed-volts", "file-cut"], 149),
    "single_step_backwards.csv": (["time-backwards", "gaps"], 59),
    "some_nan_and_words.csv": (["values-missing"], 60),
    "time_without_unit.csv": (["assumed-time-unit"], 60),
    "uneven_behind_an_even_head.csv": (["repeated-stamps"], 62),
    "times_that_repeat_for_no_grid.npz": (["repeated-stamps", "assumed-volts"], 4),
    "times_beyond_any_record.npz": (["repeated-stamps", "assumed-volts"], 3),
    "unknown_states.vcd": ([], 0),
    "zeros_at_the_end.csv": (["file-cut"], 60),
}


def test_every_file_of_the_corpus_has_its_expectation() -> None:
    assert {path.name for path in CORPUS.iterdir()} == {*REFUSED, *READ}


@pytest.mark.parametrize("name", REFUSED)
def test_fault_is_one_clear_error(name: str) -> None:
    kind, code = REFUSED[name]
    with pytest.raises(BenchtoolError) as caught:
        read_capture(CORPUS / name)
    error = caught.value
    assert type(error) is kind
    assert error.code == code
    assert name in error.message or code == "ambiguous-structure"
    assert "\n" not in error.message
    assert error.hint.endswith(".")
    assert str(pickle.loads(pickle.dumps(error))) == error.message


@pytest.mark.parametrize(
    "name", [n for n, (kind, _) in REFUSED.items() if kind is AmbiguousStructureError]
)
def test_what_the_file_does_not_say_names_an_option(name: str) -> None:
    with pytest.raises(AmbiguousStructureError) as caught:
        read_capture(CORPUS / name)
    assert "--" in caught.value.hint


@pytest.mark.parametrize("limit", [1 << 20, 0], ids=["in memory", "in blocks"])
@pytest.mark.parametrize("name", READ)
def test_damage_is_counted_and_the_rest_is_read(name: str, limit: int) -> None:
    codes, size = READ[name]
    capture = read_capture(CORPUS / name, in_memory_bytes=limit)
    assert codes_of(capture) == codes
    assert all(
        any(c.isdigit() for c in n.text) or "assumed" in n.code or "cut" in n.code
        for n in capture.warnings
    )
    trace = capture.traces[0]
    if isinstance(trace, Waveform):
        assert sum(b.size for b in trace.samples.blocks()) == trace.samples.size
        if isinstance(trace.time, StampedTime):
            assert sum(b.size for b in trace.time.stamps.blocks()) == trace.samples.size
    if size and name != "cut_gz.csv.gz":
        assert trace.samples.size == size  # type: ignore[union-attr]
    elif size:
        assert 50 < trace.samples.size < 400  # type: ignore[union-attr]


@given(
    name=st.sampled_from(sorted([*REFUSED, *READ])),
    at=st.floats(0, 1),
    width=st.integers(0, 20),
    patch=st.binary(max_size=8) | st.sampled_from([b"\n", b",", b";", b"0.5", b'"', b"#", b"NaN"]),
)
@settings(max_examples=150, derandomize=True, deadline=None)
def test_further_damage_is_never_an_internal_fault(
    tmp_path_factory: pytest.TempPathFactory, name: str, at: float, width: int, patch: bytes
) -> None:
    content = bytearray((CORPUS / name).read_bytes())
    start = int(at * len(content))
    content[start : start + width] = patch
    path = tmp_path_factory.mktemp("damaged") / name
    path.write_bytes(bytes(content))
    with contextlib.suppress(BenchtoolError):
        for trace in read_capture(path).traces:
            if isinstance(trace, Waveform):
                assert sum(b.size for b in trace.samples.blocks()) == trace.spans[-1].stop


def test_reading_text_loads_no_heavy_library() -> None:
    script = (
        "import sys; from benchtool.formats import read_capture; read_capture(sys.argv[1]); "
        "print(*sorted({'numpy.ma', 'pandas', 'scipy', 'csv', 'tempfile'} & set(sys.modules)))"
    )
    path = str(CORPUS / "flat_line.csv")
    run = subprocess.run(
        [sys.executable, "-c", script, path], capture_output=True, text=True, check=True
    )
    assert run.stdout.strip() == ""
