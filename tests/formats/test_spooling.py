"""Columns are decoded once: what is walked again comes from a spool, in memory or on disk."""

from __future__ import annotations

import errno
from pathlib import Path

import numpy as np
import pytest
from read_back import codes_of, values_of

from benchtool.formats import read_capture, spool
from benchtool.formats.content import open_content
from benchtool.formats.spool import ColumnSpool
from benchtool.formats.text import walking
from benchtool.formats.text.decoding import Decoder
from benchtool.formats.text.walking import TextSamples
from benchtool.model.capture import Capture, StampedTime, Waveform


def write(path: Path, *, uneven: bool = False) -> Path:
    rng = np.random.default_rng(5)
    steps = rng.uniform(1, 3, 4000) if uneven else np.ones(4000)
    times, volts = np.cumsum(steps) * 1e-5, rng.normal(0, 1, 4000)
    rows = "".join(
        f"{t:.9f},{v:.4f},{i % 2}\n"
        for i, (t, v) in enumerate(zip(times.tolist(), volts.tolist(), strict=True))
    )
    path.write_text("time_s,A (V),B\n" + rows)
    return path


def large(path: Path, monkeypatch: pytest.MonkeyPatch, in_memory: int) -> Capture:
    """Read a file as if it were large."""
    monkeypatch.setattr(walking, "BLOCK_BYTES", 3000)
    monkeypatch.setattr(spool, "COLUMNS_IN_MEMORY_BYTES", in_memory)
    return read_capture(path, in_memory_bytes=0)


def stamps_of(trace: object) -> np.ndarray:
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, StampedTime)
    return np.concatenate(list(trace.time.stamps.blocks()))


@pytest.mark.parametrize("in_memory", [1 << 20, 0], ids=["memory", "disk"])
@pytest.mark.parametrize("uneven", [False, True])
def test_a_spooled_column_is_the_decoded_one(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, in_memory: int, uneven: bool
) -> None:
    path = write(tmp_path / "a.csv", uneven=uneven)
    held = read_capture(path)
    walked = large(path, monkeypatch, in_memory)
    for mine, theirs in zip(walked.traces, held.traces, strict=True):
        np.testing.assert_array_equal(values_of(mine), values_of(theirs))
        if uneven:
            np.testing.assert_array_equal(stamps_of(mine), stamps_of(theirs))


def test_the_text_is_decoded_once(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    capture = large(write(tmp_path / "a.csv"), monkeypatch, 0)

    def refuse(*_: object) -> None:
        raise AssertionError("decoded again")

    monkeypatch.setattr(Decoder, "decode", refuse)
    assert [values_of(trace).size for trace in capture.traces] == [4000, 4000]


def test_a_full_disk_costs_time_and_nothing_else(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = write(tmp_path / "a.csv")
    held = read_capture(path)

    def refuse(_: object) -> None:
        raise OSError(errno.ENOSPC, "No space left on device")

    monkeypatch.setattr(spool, "_nameless_file", refuse)
    walked = large(path, monkeypatch, 0)
    trace = walked.traces[0]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.samples, TextSamples)
    assert trace.samples.spool is None
    np.testing.assert_array_equal(values_of(trace), values_of(held.traces[0]))


@pytest.mark.parametrize("limit", [1 << 20, 0])
def test_columns_of_any_type_come_back(limit: int) -> None:
    kept = ColumnSpool(limit)
    blocks = [
        [np.array([1, -2], np.int8), np.array([0.5, np.nan])],
        [np.array([70000], np.int32), np.array([-0.25])],
        [np.array([], np.int8), np.array([])],
    ]
    for block in blocks:
        kept.append(block)
    for i, block in enumerate(blocks):
        for k, column in enumerate(block):
            assert kept.read(i, k).dtype == np.float64
            np.testing.assert_array_equal(kept.read(i, k), column)


def test_a_file_that_grows_is_read_as_it_was(tmp_path: Path) -> None:
    path = write(tmp_path / "a.csv")
    before = read_capture(path)
    content = open_content(path, in_memory_bytes=0)
    with path.open("a") as file:
        file.write("0.040010000,9.0,1\n" * 50)
    rows = content.settled(before)
    assert codes_of(rows) == [*codes_of(before), "file-grew"] or "file-grew" in codes_of(rows)
    assert rows.origin.sha256 == before.origin.sha256
    assert b"9.0,1" not in content.tail(200)


@pytest.mark.parametrize("block", [7, 100, 1000])
def test_blocks_are_whole_lines_and_all_of_them(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, block: int
) -> None:
    rng = np.random.default_rng(block)
    lines = [f"{i * 1e-3:.3f},{'1' * int(n)}\n" for i, n in enumerate(rng.integers(1, 40, 300))]
    for width in (None, "1.25"):  # ragged, and all alike
        if width:
            lines = [f"{i * 1e-3:.3f},{width}\n" for i in range(300)]
        path = tmp_path / "a.csv"
        path.write_text("time_s,A (V)\n" + "".join(lines))
        monkeypatch.setattr(walking, "BLOCK_BYTES", block)
        capture = read_capture(path, in_memory_bytes=0)
        trace = capture.traces[0]
        assert isinstance(trace, Waveform)
        assert isinstance(trace.samples, TextSamples)
        pieces = list(trace.samples.source.blocks())
        assert b"".join(piece for _, piece in pieces) == "".join(lines).encode()
        assert all(piece.endswith(b"\n") for _, piece in pieces)
        starts = np.cumsum([0, *(len(piece) for _, piece in pieces[:-1])])
        assert [at - pieces[0][0] for at, _ in pieces] == starts.tolist()
