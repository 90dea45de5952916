"""WAVE files written by the standard library, or by hand where it cannot, read back."""

from __future__ import annotations

import io
import struct
import wave

import numpy as np
import pytest
from read_back import Read, codes_of, values_of

import benchtool.formats.wav.reader as wav_room
from benchtool.errors import MalformedCaptureError
from benchtool.model.capture import Capture, UniformTime, Waveform

N = 1000


def written(codes: np.ndarray, width: int, rate: int = 44100) -> bytes:
    """Return a WAVE file of (n, channels) signed codes, written by the wave module."""
    data = b"".join(
        int(c + 128 if width == 1 else c).to_bytes(width, "little", signed=width > 1)
        for c in codes.ravel()
    )
    file = io.BytesIO()
    with wave.open(file, "wb") as stream:
        stream.setnchannels(codes.shape[1])
        stream.setsampwidth(width)
        stream.setframerate(rate)
        stream.writeframes(data)
    return file.getvalue()


def by_hand(form: bytes, data: bytes, size: int | None = None, extra: bytes = b"") -> bytes:
    chunks = b"fmt " + struct.pack("<I", len(form)) + form + extra
    chunks += b"data" + struct.pack("<I", len(data) if size is None else size) + data
    return b"RIFF" + struct.pack("<I", 4 + len(chunks)) + b"WAVE" + chunks


def channel(capture: Capture, place: int = 0) -> Waveform:
    trace = capture.traces[place]
    assert isinstance(trace, Waveform)
    return trace


@pytest.mark.parametrize("n_channels", [1, 2, 3])
@pytest.mark.parametrize("width", [1, 2, 3, 4])
def test_integers_are_read_back_as_codes(read: Read, width: int, n_channels: int) -> None:
    rng = np.random.default_rng(width)
    full = 2 ** (8 * width - 1)
    codes = rng.integers(-full, full, (N, n_channels))
    capture = read(written(codes, width), "a.wav")
    for k in range(n_channels):
        trace = channel(capture, k)
        assert np.concatenate(list(trace.samples.blocks())).tolist() == codes[:, k].tolist()
        assert trace.samples.dtype.kind == "i"
        assert trace.time == UniformTime(dt_s=1 / 44100)
        assert trace.scale.gain == 1 / full
        assert trace.scale.step_v == 1 / full
    assert codes_of(capture) == ["assumed-volts"]


@pytest.mark.parametrize(("bits", "dtype"), [(32, "<f4"), (64, "<f8")])
def test_floats_are_read_back(read: Read, bits: int, dtype: str) -> None:
    values = np.random.default_rng(1).normal(0, 0.3, N).astype(dtype)
    form = struct.pack("<HHIIHH", 3, 1, 48000, 48000 * bits // 8, bits // 8, bits)
    trace = channel(read(by_hand(form, values.tobytes()), "a.wav"))
    assert values_of(trace).tolist() == values.astype(float).tolist()
    assert trace.scale.step_v is None


def test_extensible_form_and_chunks_before_the_data(read: Read) -> None:
    codes = np.arange(-20, 20, dtype="<i2")
    form = struct.pack("<HHIIHH", 0xFFFE, 1, 8000, 16000, 2, 16)
    form += (
        struct.pack("<HHIH", 22, 16, 4, 1)
        + b"\x00\x00\x00\x00\x10\x00\x80\x00\x00\xaa\x00\x38\x9b\x71"
    )
    extra = b"LIST" + struct.pack("<I", 3) + b"abc\0"
    trace = channel(read(by_hand(form, codes.tobytes(), extra=extra), "a.wav"))
    assert np.concatenate(list(trace.samples.blocks())).tolist() == codes.tolist()


def test_data_shorter_than_its_header_says(read: Read) -> None:
    whole = written(np.arange(N).reshape(-1, 1), 2)
    capture = read(whole[: len(whole) - 301], "a.wav")
    assert channel(capture).samples.size == N - 151
    assert codes_of(capture) == ["assumed-volts", "file-cut"]
    assert "1000" in capture.warnings[1].text
    assert "849" in capture.warnings[1].text


@pytest.mark.parametrize("size", [0, 0xFFFFFFFF])
def test_data_of_unstated_size_goes_to_the_end(read: Read, size: int) -> None:
    form = struct.pack("<HHIIHH", 1, 1, 8000, 16000, 2, 16)
    capture = read(by_hand(form, np.arange(50, dtype="<i2").tobytes(), size=size), "a.wav")
    assert channel(capture).samples.size == 50
    assert codes_of(capture) == ["assumed-volts"]


def test_blocks_join_to_the_whole(read: Read, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(wav_room, "BLOCK", 64)
    codes = np.random.default_rng(2).integers(-8000, 8000, (N, 2))
    samples = channel(read(written(codes, 3), "a.wav", limit=0), 1).samples
    pieces = list(samples.blocks(100, 700))
    assert max(piece.size for piece in pieces) == 64
    assert np.concatenate(pieces).tolist() == codes[100:700, 1].tolist()


@pytest.mark.parametrize(
    ("content", "code"),
    [
        (b"RIFF\x00\x00\x00\x00WAVE", "header-cut"),
        (by_hand(struct.pack("<HHIIHH", 1, 1, 8000, 16000, 2, 16), b""), "no-rows"),
        (by_hand(struct.pack("<HHIIHH", 2, 1, 8000, 8000, 1, 4), b"abcdefgh"), "malformed-capture"),
        (by_hand(struct.pack("<HHIIHH", 1, 0, 8000, 8000, 1, 8), b"abcdefgh"), "malformed-capture"),
        (by_hand(struct.pack("<HHIIHH", 1, 1, 0, 8000, 1, 8), b"abcdefgh"), "malformed-capture"),
    ],
)
def test_each_damage_has_its_code(read: Read, content: bytes, code: str) -> None:
    with pytest.raises(MalformedCaptureError) as caught:
        read(content, "a.wav")
    assert caught.value.code == code
