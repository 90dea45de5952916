"""WAVE files written by the standard library, or by hand where it cannot, read back."""

from __future__ import annotations

import io
import struct
import wave

import numpy as np
import pytest
from read_back import Read, codes_of, values_of

from benchtool.errors import MalformedCaptureError
from benchtool.formats import stored
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


def codes_in(trace: Waveform) -> list[float]:
    return [x for block in trace.samples.blocks() for x in block.tolist()]


def form_of(code: int, bits: int, n_channels: int = 1, n_bytes: int = 0, order: str = "<") -> bytes:
    frame = n_channels * (n_bytes or bits // 8)
    return struct.pack(f"{order}HHIIHH", code, n_channels, 8000, 8000 * frame, frame, bits)


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
    codes = np.arange(1000, 1050, dtype="<i2")
    capture = read(by_hand(form, codes.tobytes() + b"?", size=size), "a.wav")
    assert codes_in(channel(capture)) == codes.tolist()
    assert codes_of(capture) == ["assumed-volts", "data-size-unstated"]
    assert "50 samples" in capture.warnings[1].text


def test_data_of_no_bytes_before_other_chunks_is_none(read: Read) -> None:
    form = struct.pack("<HHIIHH", 1, 1, 8000, 16000, 2, 16)
    behind = b"LIST" + struct.pack("<I", 4) + b"abcd"
    with pytest.raises(MalformedCaptureError) as caught:
        read(by_hand(form, b"", size=0) + behind, "a.wav")
    assert caught.value.code == "no-rows"


def test_blocks_join_to_the_whole(read: Read, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(stored, "BLOCK", 64)
    monkeypatch.setattr(stored, "BLOCK_BYTES", 64)
    monkeypatch.setattr(stored, "_WINDOW", 4 * 64 * 6)
    codes = np.random.default_rng(2).integers(-8000, 8000, (N, 2))
    samples = channel(read(written(codes, 3), "a.wav", limit=0), 1).samples
    pieces = list(samples.blocks(100, 700))
    assert max(piece.size for piece in pieces) == 64
    assert np.concatenate(pieces).tolist() == codes[100:700, 1].tolist()


@pytest.mark.parametrize("limit", [1 << 20, 0], ids=["in memory", "mapped"])
@pytest.mark.parametrize(("code", "bits"), [(1, 16), (1, 24), (1, 32), (3, 32), (3, 64)])
def test_big_endian_file_is_read(read: Read, code: int, bits: int, limit: int) -> None:
    values = np.arange(-50, 50).reshape(-1, 2) * (0.0078125 if code == 3 else 500)
    if code == 3:
        data = values.astype(f">f{bits // 8}").tobytes()
    else:
        data = b"".join(int(v).to_bytes(bits // 8, "big", signed=True) for v in values.ravel())
    form = form_of(code, bits, 2, order=">")
    chunks = b"fmt " + struct.pack(">I", len(form)) + form
    chunks += b"data" + struct.pack(">I", len(data)) + data
    content = b"RIFX" + struct.pack(">I", 4 + len(chunks)) + b"WAVE" + chunks
    capture = read(content, "a.wav", limit=limit)
    assert [codes_in(channel(capture, k)) for k in (0, 1)] == values.T.tolist()


@pytest.mark.parametrize("mark", [b"RF64", b"BW64"])
def test_size_of_a_large_file_stands_in_its_own_chunk(read: Read, mark: bytes) -> None:
    codes = np.arange(-20, 20, dtype="<i2")
    sizes = b"ds64" + struct.pack("<IQQQI", 28, 0, codes.nbytes, 40, 0)
    form = form_of(1, 16)
    content = mark + b"\xff\xff\xff\xffWAVE" + sizes + b"fmt " + struct.pack("<I", 16) + form
    content += b"data\xff\xff\xff\xff" + codes.tobytes() + b"LIST\x02\0\0\0ab"
    capture = read(content, "a.wav")
    assert codes_in(channel(capture)) == codes.tolist()
    assert codes_of(capture) == ["assumed-volts"]


def test_narrow_samples_stand_in_the_high_bits_of_their_container(read: Read) -> None:
    stored = np.arange(-50, 50, dtype="<i4") << 8
    capture = read(by_hand(form_of(1, 24, n_bytes=4), stored.tobytes()), "a.wav")
    trace = channel(capture)
    assert trace.scale.gain == 2.0**-31
    assert trace.scale.step_v == 2.0**-23
    assert values_of(trace) == pytest.approx(np.arange(-50, 50) * 2.0**-23, rel=1e-12)


def test_walk_of_a_mapped_file_is_that_of_one_in_memory(read: Read) -> None:
    values = np.random.default_rng(3).normal(0, 0.3, (70_000, 2)).astype("<f8")
    content = by_hand(form_of(3, 64, 2), values.tobytes(), extra=b"odd \x03\0\0\0abc\0")
    for limit in (0, 1 << 30):
        samples = channel(read(content, "a.wav", limit=limit), 1).samples
        whole = np.concatenate(list(samples.blocks(5, 69_999)))
        assert whole.tolist() == values[5:69_999, 1].tolist()


@pytest.mark.parametrize(
    ("content", "code"),
    [
        (b"RIFF\x00\x00\x00\x00WAVE", "header-cut"),
        (by_hand(struct.pack("<HHIIHH", 1, 1, 8000, 16000, 2, 16), b""), "no-rows"),
        (by_hand(struct.pack("<HHIIHH", 2, 1, 8000, 8000, 1, 4), b"abcdefgh"), "malformed-capture"),
        (by_hand(struct.pack("<HHIIHH", 1, 0, 8000, 8000, 1, 8), b"abcdefgh"), "malformed-capture"),
        (by_hand(struct.pack("<HHIIHH", 1, 1, 0, 8000, 1, 8), b"abcdefgh"), "malformed-capture"),
        (
            by_hand(struct.pack("<HHIIHH", 1, 2, 8000, 8000, 3, 16), b"abcdefgh"),
            "malformed-capture",
        ),
        (
            by_hand(struct.pack("<HHIIHH", 1, 1, 8000, 8000, 8, 64), b"abcdefgh"),
            "malformed-capture",
        ),
    ],
)
def test_each_damage_has_its_code(read: Read, content: bytes, code: str) -> None:
    with pytest.raises(MalformedCaptureError) as caught:
        read(content, "a.wav")
    assert caught.value.code == code
