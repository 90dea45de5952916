"""A counter's readings in a NumPy archive of our own; the first of its arrays tells it apart.

================== ================================================================
``counted``        version of this layout, 1
``source``         the connection, as the user named it
``identity``       what the counter answers when asked who it is
``dialect``        the dialect it was spoken to in
``channel``        its input
``resolution``     step of a single interval in seconds
``start_ns``       when the run began, nanoseconds since 1970 (UTC); optional
``settings``       query and answer of each setting, shape (m, 2)
``warnings``       code and text of each warning, shape (m, 2)
------------------ ----------------------------------------------------------------
``period`` ...     the readings of ``t_high``, ``t_low``, ``period``, ``frequency``,
                   ``duty``, in s, Hz or as a ratio; those that were counted
``period.per``     ``interval`` or ``gate``: what one of them is
``period.gate``    length of the gate in seconds; optional
``period.missing`` readings that were marked as none
``period.chains``  ranges (start, stop) of readings that follow each other, (m, 2)
================== ================================================================
"""

from __future__ import annotations

import struct
import zipfile
import zlib
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any, BinaryIO

import numpy as np

from benchtool.errors import MalformedCaptureError
from benchtool.formats.content import Content
from benchtool.formats.sink import opened
from benchtool.model.counted import COUNTED_NAMES, Counted, CountedName, Readings
from benchtool.model.quantity import Notice

_VERSION = 1
_MAGIC, _FIRST = b"PK\x03\x04", b"counted.npy"
_LARGEST_BYTES = 1 << 30
_DAMAGE = (
    *(KeyError, ValueError, TypeError, IndexError, EOFError, OSError, OverflowError),
    *(MemoryError, RuntimeError, NotImplementedError, zipfile.BadZipFile, zlib.error, struct.error),
)
"""What zipfile, zlib and numpy raise over a damaged archive, and records over wrong content."""

_HEAD_BYTES = 30 + len(_FIRST)


def is_counted(content: Content) -> bool:
    """Say whether a file holds a counter's readings: its first array says so."""
    head = content.head(_HEAD_BYTES)
    return head.startswith(_MAGIC) and head[30:] == _FIRST


def refuse_counted(content: Content) -> None:
    """Refuse to take a counter's readings for a capture.

    Raises:
        MalformedCaptureError: ``counter-readings``.
    """
    if is_counted(content):
        raise MalformedCaptureError(
            f"{content.source} holds a counter's readings and no trace to look at",
            hint=f"Measure it: benchtool measure {content.source}.",
            path=content.source,
            code="counter-readings",
        )


def write_counted(counted: Counted, file: BinaryIO | Path) -> None:
    """Write readings; nothing of them is lost.

    Args:
        counted: The readings.
        file: Binary file object, or path of the file to write.
    """
    arrays: dict[str, Any] = {
        "counted": _VERSION,
        "source": counted.source,
        "identity": counted.identity,
        "dialect": counted.dialect,
        "channel": counted.channel,
        "resolution": counted.resolution_s,
        "settings": _pairs(counted.settings),
        "warnings": _pairs(tuple((item.code, item.text) for item in counted.warnings)),
    }
    if counted.start_ns is not None:
        arrays["start_ns"] = counted.start_ns
    for name, item in counted.readings.items():
        arrays |= {f"{name}{key}": value for key, value in _arrays_of(item)}
    with opened(file) as stream:
        np.savez_compressed(stream, **arrays)


def _pairs(pairs: tuple[tuple[str, str], ...]) -> Any:
    return np.array(pairs, dtype=np.str_) if pairs else np.empty((0, 2), dtype="U1")


def _arrays_of(item: Readings) -> Iterator[tuple[str, Any]]:
    yield "", item.values
    yield ".per", item.per
    yield ".missing", item.n_missing
    yield ".chains", np.array(item.chains, dtype=np.int64).reshape(-1, 2)
    if item.gate_s is not None:
        yield ".gate", item.gate_s


def read_counted(content: Content) -> Counted:
    """Read what ``write_counted`` wrote; ``source`` is the file, as every capture has it.

    Raises:
        MalformedCaptureError: If it is damaged, or of a later version (``damaged-readings``).
    """
    try:
        return _counted(_arrays(content), content)
    except _DAMAGE as error:
        raise MalformedCaptureError(
            f"{content.source} is damaged: the readings in it cannot be had ({_said(error)})",
            hint="Copy it again from where it was written, or take the readings again.",
            path=content.source,
            code="damaged-readings",
        ) from error


def _arrays(content: Content) -> dict[str, Any]:
    with content.open() as file, zipfile.ZipFile(file) as archive:
        n_bytes = sum(member.file_size for member in archive.infolist())
    if n_bytes > _LARGEST_BYTES:
        raise ValueError(f"it would unpack to {n_bytes >> 20} MiB")
    with content.open() as file, np.load(file, allow_pickle=False) as loaded:
        return {name: loaded[name] for name in loaded.files}


def _said(error: Exception) -> str:
    return f"no array {error}" if isinstance(error, KeyError) else str(error)


def _counted(arrays: Mapping[str, Any], content: Content) -> Counted:
    if int(arrays["counted"]) != _VERSION:
        raise ValueError(f"its layout is version {int(arrays['counted'])}")
    readings: dict[CountedName, Readings] = {
        name: _readings(arrays, name) for name in COUNTED_NAMES if name in arrays
    }
    return Counted(
        source=content.source,
        identity=str(arrays["identity"]),
        dialect=str(arrays["dialect"]),
        channel=str(arrays["channel"]),
        readings=readings,
        resolution_s=float(arrays["resolution"]),
        start_ns=int(arrays["start_ns"]) if "start_ns" in arrays else None,
        sha256=content.sha256,
        settings=tuple((str(query), str(answer)) for query, answer in arrays["settings"]),
        warnings=tuple(Notice(code=str(code), text=str(text)) for code, text in arrays["warnings"]),
    )


def _readings(arrays: Mapping[str, Any], name: CountedName) -> Readings:
    per = str(arrays[f"{name}.per"])
    if per not in ("interval", "gate"):
        raise ValueError(f"a reading of {name} is per {per!r}")
    gate = arrays.get(f"{name}.gate")
    return Readings(
        values=np.asarray(arrays[name], dtype=np.float64),
        per="gate" if per == "gate" else "interval",
        gate_s=None if gate is None else float(gate),
        n_missing=int(arrays[f"{name}.missing"]),
        chains=tuple((int(start), int(stop)) for start, stop in arrays[f"{name}.chains"]),
    )
