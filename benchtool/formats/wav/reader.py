"""From a WAVE file to a capture: integer and floating PCM, mapped and walked in blocks."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np

from benchtool.formats.content import Content
from benchtool.formats.stored import Decode, StoredSamples, as_they_are
from benchtool.formats.wav.layout import FLOAT, WaveLayout, malformed, read_layout
from benchtool.model.arrays import NDArray
from benchtool.model.capture import (
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


def read_wav(content: Content, options: ReadOptions) -> Capture:
    """Read a WAVE file: each channel a waveform of codes, full scale taken as 1 V.

    Raises:
        MalformedCaptureError: If a chunk is damaged, lacking or of an unknown coding.
    """
    del options
    layout = read_layout(content)
    if layout.n_frames < 2:
        raise malformed(content, f"holds {layout.n_frames} samples; a wave needs more", "no-rows")
    return Capture(
        origin=Origin(source=content.source, format="wav", sha256=content.sha256),
        traces=tuple(_trace(content, layout, channel) for channel in range(layout.n_channels)),
        structure=_points(layout),
        warnings=tuple(_notices(layout)),
    )


def _trace(content: Content, layout: WaveLayout, channel: int) -> Waveform:
    stored, decode = _coding(layout)
    full = 1.0 if layout.code == FLOAT else 2.0 ** (8 * layout.n_bytes - 1)
    samples = StoredSamples(
        content=content,
        offset=layout.offset + channel * layout.n_bytes,
        stored=stored,
        stride=layout.n_channels * layout.n_bytes,
        size=layout.n_frames,
        decode=decode,
    )
    return Waveform(
        samples=samples,
        scale=Scale(
            gain=1 / full, step_v=None if layout.code == FLOAT else 2.0 ** (1 - layout.bits)
        ),
        time=UniformTime(dt_s=1 / layout.rate_hz),
        spans=(Span(start=0, stop=layout.n_frames, start_s=0.0),),
        channel=f"channel {channel + 1}",
    )


def _coding(layout: WaveLayout) -> tuple[np.dtype[Any], Decode]:
    """Return the type of a stored sample, and what makes a number of it."""
    if layout.code == FLOAT:
        return np.dtype(f"{layout.order}f{layout.n_bytes}"), as_they_are
    if layout.n_bytes == 1:
        return np.dtype(np.uint8), _from_8_bits
    if layout.n_bytes == 3:
        return np.dtype("V3"), _from_24_bits if layout.order == "<" else _from_turned_24_bits
    return np.dtype(f"{layout.order}i{layout.n_bytes}"), as_they_are


def _from_8_bits(rows: NDArray[Any]) -> NDArray[Any]:
    """Return 8-bit samples, which alone have an offset, 128, as int16."""
    return rows.astype(np.int16) - np.int16(128)


def _from_24_bits(rows: NDArray[Any]) -> NDArray[Any]:
    """Return little-endian 24-bit integers as int32."""
    wide = np.zeros((rows.size, 4), np.uint8)
    wide[:, 1:] = np.ascontiguousarray(rows).view(np.uint8).reshape(-1, 3)
    return wide.view("<i4").ravel().astype(np.int32) >> 8


def _from_turned_24_bits(rows: NDArray[Any]) -> NDArray[Any]:
    """Return big-endian 24-bit integers as int32."""
    turned = np.ascontiguousarray(rows).view(np.uint8).reshape(-1, 3)[:, ::-1]
    return _from_24_bits(np.ascontiguousarray(turned).view("V3").ravel())


def _notices(layout: WaveLayout) -> Iterator[Notice]:
    yield Notice(
        code="assumed-volts",
        text="a WAVE file states no volts: its full scale is taken as 1 V; "
        "only voltages depend on it, no time does",
    )
    if layout.n_promised is None:
        yield Notice(
            code="data-size-unstated",
            text="the header states no size of its data, as a recording that was not closed: "
            f"{layout.n_frames} samples a channel were read, to the end of the file",
        )
    elif layout.n_frames < layout.n_promised:
        yield Notice(
            code="file-cut",
            text=f"the header promises {layout.n_promised} samples a channel, "
            f"the file holds {layout.n_frames}",
        )


def _points(layout: WaveLayout) -> tuple[StructurePoint, ...]:
    kind = "float" if layout.code == FLOAT else "integer"
    points = (
        ("coding", f"{layout.bits}-bit {kind}", "fmt chunk"),
        ("channels", str(layout.n_channels), "fmt chunk"),
        ("interval", f"{1 / layout.rate_hz:.9g} s", f"fmt chunk: {layout.rate_hz} samples/s"),
        ("rows", str(layout.n_frames), "data chunk"),
    )
    return tuple(
        StructurePoint(name=n, value=v, evidence=e, sure="measured" if n == "rows" else "stated")
        for n, v, e in points
    )
