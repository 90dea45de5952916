"""The chunks of a WAVE file: how its samples are stored, and where.

References:
    Multimedia Programming Interface and Data Specifications 1.0 (1991), "WAVE";
    ITU-R BS.2088-1 (2019), annex 1, for RF64 and BW64 (``ds64``).
"""

from __future__ import annotations

import struct
from collections.abc import Iterator
from typing import BinaryIO

from benchtool.errors import MalformedCaptureError
from benchtool.formats.content import Content
from benchtool.frozen import frozen_record

PCM, FLOAT = 1, 3
_EXTENSIBLE = 0xFFFE
_GUID_TAIL = bytes.fromhex("000000001000800000aa00389b71")
_UNSTATED = 0xFFFFFFFF
_MARKS = {b"RIFF": "<", b"RIFX": ">", b"RF64": "<", b"BW64": "<"}
_MOST_CHANNELS = 64


@frozen_record
class WaveLayout:
    """What the chunks say.

    Attributes:
        order: ``<`` or ``>``, the byte order.
        code: 1 for integers, 3 for floats.
        n_channels: Channels of a frame.
        rate_hz: Frames a second.
        n_bytes: Bytes of a stored sample.
        bits: Bits of it that count, the highest ones.
        offset: Byte offset of the first frame.
        n_frames: Whole frames in the file.
        n_promised: Frames that the header promises, None where it does not say.
    """

    order: str
    code: int
    n_channels: int
    rate_hz: int
    n_bytes: int
    bits: int
    offset: int
    n_frames: int
    n_promised: int | None


def read_layout(content: Content) -> WaveLayout:
    """Walk the chunks up to the data.

    Raises:
        MalformedCaptureError: If a chunk is damaged, lacking or of an unknown coding.
    """
    form: bytes | None = None
    data_size: int | None = None
    with content.open() as file:
        mark = file.read(4)
        order = _MARKS.get(mark, "<")
        for name, size, at in _chunks(file, order, content.size):
            if name == b"ds64":
                data_size = int.from_bytes(file.read(24)[8:16], "little")
            elif name == b"fmt ":
                form = file.read(min(size, 64))
            elif name == b"data":
                stated: int | None = size
                if size == _UNSTATED:
                    stated = data_size
                elif size == 0 and not _goes_on(file, order, at, content):
                    stated = None
                return _layout(content, order, form, at, stated)
    what = "has no data chunk" if form else "has no fmt chunk"
    raise malformed(content, what, "header-cut")


def _chunks(
    file: BinaryIO, order: str, n_bytes: int, at: int = 12
) -> Iterator[tuple[bytes, int, int]]:
    """Yield name, size and offset of each chunk; the file stands at its first byte."""
    while at + 8 <= n_bytes:
        file.seek(at)
        name, size = struct.unpack(f"{order}4sI", file.read(8))
        yield name, size, at + 8
        at += 8 + size + size % 2


def _goes_on(file: BinaryIO, order: str, at: int, content: Content) -> bool:
    """Whether what follows a data chunk of no bytes is chunks up to the very end."""
    end = at
    for name, size, offset in _chunks(file, order, content.size, at):
        if not name.decode("latin-1").isprintable():
            return False
        end = offset + size + size % 2
    return end == content.size


def _layout(
    content: Content, order: str, form: bytes | None, offset: int, size: int | None
) -> WaveLayout:
    if form is None or len(form) < 16:
        raise malformed(content, "has no whole fmt chunk before its data", "header-cut")
    code, n_channels, rate_hz, _, align, bits = struct.unpack_from(f"{order}HHIIHH", form)
    kind, valid = _coding(code, bits, form, order)
    n_bytes = _width(bits, align, n_channels)
    if not (_is_readable(kind, bits, n_bytes) and 1 <= n_channels <= _MOST_CHANNELS and rate_hz):
        what = f"has coding {code} with {bits} bits, {n_channels} channels at {rate_hz} Hz"
        raise malformed(content, f"{what}; only PCM of 1 to 32 bits and floats are read", None)
    frame = n_channels * n_bytes
    if align not in (0, frame):
        what = f"says that a frame has {align} bytes, and {n_channels} channels of {bits} bits"
        raise malformed(content, what, None)
    n_there = max(0, content.size - offset) // frame
    n_promised = None if size is None else size // frame
    return WaveLayout(
        order=order,
        code=kind,
        n_channels=n_channels,
        rate_hz=rate_hz,
        n_bytes=n_bytes,
        bits=valid,
        offset=offset,
        n_frames=n_there if n_promised is None else min(n_there, n_promised),
        n_promised=n_promised,
    )


def _width(bits: int, align: int, n_channels: int) -> int:
    """Return the bytes of a sample; in a wider container it stands in the highest bits."""
    n_bytes = (bits + 7) // 8
    if n_channels and align % n_channels == 0 and n_bytes < align // n_channels <= 4:
        return align // n_channels
    return n_bytes


def _is_readable(kind: int, bits: int, n_bytes: int) -> bool:
    return bits in (32, 64) if kind == FLOAT else kind == PCM and 1 <= n_bytes <= 4


def _coding(code: int, bits: int, form: bytes, order: str) -> tuple[int, int]:
    """Return the coding and the bits that count; an extensible form states them behind."""
    if code != _EXTENSIBLE or len(form) < 40:
        return code, bits
    valid, _, behind = struct.unpack_from(f"{order}HIH", form, 18)
    known = form[26:40] == _GUID_TAIL
    return behind if known else code, valid if 0 < valid <= bits else bits


def malformed(content: Content, what: str, code: str | None) -> MalformedCaptureError:
    """Return the error for a WAVE file that cannot be read."""
    return MalformedCaptureError(
        f"{content.source} {what}",
        hint="Save the capture again, or export it as delimited text.",
        path=content.source,
        code=code,
    )
