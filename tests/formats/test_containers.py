"""One capture through every container: the same edges."""

from __future__ import annotations

import gzip
import io
import struct
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from benchtool.errors import CaptureError
from benchtool.formats import read_capture
from benchtool.model.capture import ReadOptions
from benchtool.timing.edges import find_edges

DT_S = 1 / 8000
CODES = np.where(np.arange(8000) % 190 < 70, 100, -80).astype(np.int8)
RATE = ReadOptions(interval_s=DT_S)


def text() -> bytes:
    rows = (f"{i * DT_S:.6f},{code}\n" for i, code in enumerate(CODES.tolist()))
    return ("Time (s),OUT (V)\n" + "".join(rows)).encode()


def npy() -> bytes:
    file = io.BytesIO()
    np.save(file, CODES)
    return file.getvalue()


def npz(save: Any) -> bytes:
    file = io.BytesIO()
    save(file, OUT=CODES, time_s=np.arange(CODES.size) * DT_S)
    return file.getvalue()


def wav() -> bytes:
    data = (CODES.astype(np.int16) << 8).astype("<i2").tobytes()
    form = b"fmt " + struct.pack("<IHHIIHH", 16, 1, 1, 8000, 16000, 2, 16)
    chunks = form + b"data" + struct.pack("<I", len(data)) + data
    return b"RIFF" + struct.pack("<I", 4 + len(chunks)) + b"WAVE" + chunks


def vcd() -> bytes:
    head = "$timescale 100 ns $end\n$var wire 1 ! OUT $end\n$enddefinitions $end\n"
    high = CODES > 0
    changes = np.flatnonzero(high[1:] != high[:-1])
    # between two samples, where the edge of a waveform is taken to lie
    lines = [f"#{625 + 1250 * int(i)}\n{int(high[i + 1])}!\n" for i in changes]
    return (head + "#0\n1!\n" + "".join(lines) + f"#{1250 * (CODES.size - 1)}\n").encode()


CONTAINERS: dict[str, tuple[bytes, ReadOptions]] = {
    "a.csv": (text(), ReadOptions()),
    "a.npy": (npy(), RATE),
    "a.npz": (npz(np.savez), ReadOptions()),
    "packed.npz": (npz(np.savez_compressed), ReadOptions()),
    "a.wav": (wav(), ReadOptions()),
    "a.vcd": (vcd(), ReadOptions()),
}


@pytest.fixture(params=["", ".gz", ".gz of two members"], ids=["bare", "gz", "two members"])
def shell(request: pytest.FixtureRequest) -> str:
    return str(request.param)


def wrapped(content: bytes, shell: str) -> bytes:
    half = len(content) // 2
    if shell == ".gz of two members":
        return gzip.compress(content[:half]) + gzip.compress(content[half:])
    return gzip.compress(content) if shell else content


@pytest.mark.parametrize("limit", [1 << 25, 0], ids=["in memory", "on disk"])
@pytest.mark.parametrize("name", CONTAINERS)
def test_every_container_gives_the_same_edges(
    tmp_path: Path, name: str, shell: str, limit: int
) -> None:
    content, options = CONTAINERS[name]
    path = tmp_path / (name + shell[:3])
    path.write_bytes(wrapped(content, shell))
    trace = read_capture(path, options, in_memory_bytes=limit).traces[0]
    edges = find_edges(trace)
    high = CODES > 0
    before = np.flatnonzero(high[1:] != high[:-1])
    # the levels lie as far below the middle as above it: the crossing is half way
    assert edges.times_s == pytest.approx((before + 0.5) * DT_S, abs=1e-9)
    assert edges.rising.tolist() == high[before + 1].tolist()


@pytest.mark.parametrize("suffix", [".dat", ".csv", ".wav", ".vcd", ".npz", ""])
@pytest.mark.parametrize("name", CONTAINERS)
def test_wrong_suffix_does_not_mislead(tmp_path: Path, name: str, suffix: str) -> None:
    content, options = CONTAINERS[name]
    path = tmp_path / f"capture{suffix}"
    path.write_bytes(content)
    trace = read_capture(path, options).traces[0]
    assert find_edges(trace).times_s.size == 84


@pytest.mark.parametrize("name", ["a.csv", "a.npy", "a.wav", "a.vcd"])
def test_gz_that_is_cut_is_read_as_far_as_it_goes(tmp_path: Path, name: str) -> None:
    content, options = CONTAINERS[name]
    packed = gzip.compress(content)
    path = tmp_path / f"{name}.gz"
    path.write_bytes(packed[: len(packed) * 3 // 4])
    capture = read_capture(path, options)
    edges = find_edges(capture.traces[0])
    assert 10 < edges.times_s.size < 84
    assert capture.warnings[0].code == "file-cut"
    (tmp_path / name).write_bytes(content)
    whole = find_edges(read_capture(tmp_path / name, options).traces[0])
    assert edges.times_s == pytest.approx(whole.times_s[: edges.times_s.size], abs=1e-9)


@pytest.mark.parametrize("name", CONTAINERS)
def test_gz_of_gz_is_one_clear_refusal(tmp_path: Path, name: str) -> None:
    content, options = CONTAINERS[name]
    path = tmp_path / f"{name}.gz.gz"
    path.write_bytes(gzip.compress(gzip.compress(content)))
    with pytest.raises(CaptureError) as caught:
        read_capture(path, options)
    assert "inside a gz file" in caught.value.message
