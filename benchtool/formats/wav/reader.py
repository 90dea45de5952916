"""From a RIFF WAVE file to a capture: integer and floating PCM, walked in blocks."""

from __future__ import annotations

import struct
from collections.abc import Iterator

import numpy as np

from benchtool.errors import MalformedCaptureError
from benchtool.formats.content import Content
from benchtool.frozen import frozen_record
from benchtool.model.arrays import AnyArray, NDArray
from benchtool.model.capture import (
    BLOCK,
    Capture,
    Origin,
    ReadOptions,
    Scale,
    Span,
    StructurePoint,
    UniformTime,
    Waveform,
)
from benchtool.model.quantity import Notice

_PCM, _FLOAT, _EXTENSIBLE = 1, 3, 0xFFFE
_UNKNOWN_SIZES = (0, 0xFFFFFFFF)
_STORED = {
    (_PCM, 8): "u1",
    (_PCM, 16): "<i2",
    (_PCM, 24): "u1",
    (_PCM, 32): "<i4",
    (_FLOAT, 32): "<f4",
    (_FLOAT, 64): "<f8",
}


@frozen_record(eq=False)
class WaveLayout:
    """What the ``fmt`` and ``data`` chunks say.

    Attributes:
        code: 1 for integers, 3 for floats.
        n_channels: Channels of a frame.
        rate_hz: Frames a second.
        bits: Bits of a stored sample.
        offset: Byte offset of the first frame.
        n_frames: Whole frames in the file.
        n_promised: Frames that the header promises, None where it does not say.
    """

    code: int
    n_channels: int
    rate_hz: int
    bits: int
    offset: int
    n_frames: int
    n_promised: int | None


@frozen_record(eq=False)
class WaveSamples:
    """One channel of a WAVE file, read anew each time it is walked."""

    content: Content
    layout: WaveLayout
    channel: int

    @property
    def size(self) -> int:
        """Number of samples."""
        return self.layout.n_frames

    @property
    def dtype(self) -> np.dtype[np.generic]:
        """Type of a sample."""
        if self.layout.code == _FLOAT:
            return np.dtype(f"<f{self.layout.bits // 8}")
        return np.dtype({8: "i2", 16: "<i2", 24: "<i4", 32: "<i4"}[self.layout.bits])

    def blocks(self, start: int = 0, stop: int | None = None) -> Iterator[AnyArray]:
        """Yield consecutive pieces of the samples ``start`` to ``stop``."""
        layout = self.layout
        end = self.size if stop is None else min(stop, self.size)
        frame = layout.n_channels * layout.bits // 8
        with self.content.open() as file:
            for first in range(start, end, BLOCK):
                file.seek(layout.offset + first * frame)
                yield self._decoded(file.read((min(first + BLOCK, end) - first) * frame))

    def _decoded(self, data: bytes) -> AnyArray:
        layout = self.layout
        stored = np.frombuffer(data, _STORED[layout.code, layout.bits])
        if layout.bits == 24:
            triples = stored.reshape(-1, layout.n_channels, 3)[:, self.channel]
            return _from_24_bits(triples)
        samples = stored.reshape(-1, layout.n_channels)[:, self.channel]
        if layout.bits == 8:
            return samples.astype(np.int16) - np.int16(128)  # 8-bit samples have an offset of 128
        return np.ascontiguousarray(samples)


def _from_24_bits(triples: NDArray[np.generic]) -> AnyArray:
    """Return little-endian 24-bit integers as int32."""
    wide = np.zeros((triples.shape[0], 4), np.uint8)
    wide[:, 1:] = triples
    return wide.view("<i4").ravel() >> 8


def read_wav(content: Content, options: ReadOptions) -> Capture:
    """Read a WAVE file: each channel a waveform of codes, full scale taken as 1 V.

    Raises:
        MalformedCaptureError: If a chunk is damaged, lacking or of an unknown coding.
    """
    del options
    layout = _read_layout(content)
    if layout.n_frames < 2:
        raise _malformed(content, f"holds {layout.n_frames} samples; a wave needs more", "no-rows")
    traces = tuple(_trace(content, layout, channel) for channel in range(layout.n_channels))
    notices = [
        Notice(
            code="assumed-volts",
            text="a WAVE file states no volts: its full scale is taken as 1 V; "
            "only voltages depend on it, no time does",
        )
    ]
    if layout.n_promised is not None and layout.n_frames < layout.n_promised:
        notices.append(
            Notice(
                code="file-cut",
                text=f"the header promises {layout.n_promised} samples a channel, "
                f"the file holds {layout.n_frames}",
            )
        )
    return Capture(
        origin=Origin(source=content.source, format="wav", sha256=content.sha256),
        traces=traces,
        structure=_points(layout),
        warnings=tuple(notices),
    )


def _trace(content: Content, layout: WaveLayout, channel: int) -> Waveform:
    full = 1.0 if layout.code == _FLOAT else 2.0 ** (layout.bits - 1)
    step = None if layout.code == _FLOAT else 1 / full
    return Waveform(
        samples=WaveSamples(content=content, layout=layout, channel=channel),
        scale=Scale(gain=1 / full, step_v=step),
        time=UniformTime(dt_s=1 / layout.rate_hz),
        spans=(Span(start=0, stop=layout.n_frames, start_s=0.0),),
        channel=f"channel {channel + 1}",
    )


def _points(layout: WaveLayout) -> tuple[StructurePoint, ...]:
    kind = "float" if layout.code == _FLOAT else "integer"
    points = (
        ("coding", f"{layout.bits}-bit {kind}", "fmt chunk"),
        ("channels", str(layout.n_channels), "fmt chunk"),
        ("interval", f"{1 / layout.rate_hz:.9g} s", f"fmt chunk: {layout.rate_hz} samples/s"),
        ("rows", str(layout.n_frames), "data chunk"),
    )
    return tuple(StructurePoint(name=n, value=v, evidence=e) for n, v, e in points)


def _read_layout(content: Content) -> WaveLayout:
    form: bytes | None = None
    with content.open() as file:
        at = 12
        while True:
            file.seek(at)
            chunk = file.read(8)
            if len(chunk) < 8:
                what = "has no data chunk" if form else "has no fmt chunk"
                raise _malformed(content, what, "header-cut")
            name, size = chunk[:4], int.from_bytes(chunk[4:], "little")
            if name == b"fmt ":
                form = file.read(min(size, 64))
            elif name == b"data":
                return _layout(content, form, at + 8, size)
            at += 8 + size + size % 2


def _layout(content: Content, form: bytes | None, offset: int, size: int) -> WaveLayout:
    if form is None or len(form) < 16:
        raise _malformed(content, "has no whole fmt chunk before its data", "header-cut")
    code, n_channels, rate_hz, _, _, bits = struct.unpack_from("<HHIIHH", form)
    if code == _EXTENSIBLE and len(form) >= 26:
        code = int.from_bytes(form[24:26], "little")
    if (code, bits) not in _STORED or not n_channels or not rate_hz:
        what = f"has coding {code} with {bits} bits, {n_channels} channels at {rate_hz} Hz"
        raise _malformed(content, f"{what}; only PCM of 8 to 32 bits and floats are read", None)
    frame = n_channels * bits // 8
    n_there = max(0, content.size - offset) // frame
    n_promised = None if size in _UNKNOWN_SIZES else size // frame
    return WaveLayout(
        code=code,
        n_channels=n_channels,
        rate_hz=rate_hz,
        bits=bits,
        offset=offset,
        n_frames=n_there if n_promised is None else min(n_there, n_promised),
        n_promised=n_promised,
    )


def _malformed(content: Content, what: str, code: str | None) -> MalformedCaptureError:
    return MalformedCaptureError(
        f"{content.source} {what}",
        hint="Save the capture again, or export it as delimited text.",
        path=content.source,
        code=code,
    )
