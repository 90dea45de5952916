"""Arrays as they lie in ``.npy`` files and ``.npz`` archives, found by their headers alone.

The structure of both is in the documentation of ``numpy.lib.format``.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace
from typing import IO, TYPE_CHECKING, Any

import numpy as np

from benchtool.errors import MalformedCaptureError
from benchtool.formats.content import IN_MEMORY_BYTES, Content
from benchtool.formats.spool import Spool
from benchtool.formats.stored import StoredSamples
from benchtool.frozen import frozen_record
from benchtool.model.arrays import NDArray

if TYPE_CHECKING:
    from zipfile import ZipFile, ZipInfo

_CHUNK = 1 << 20
_WIDEST = 64
_BOMB_BYTES = 4 << 30
_BOMB_RATIO = 100
_LOCAL_HEADER = 30  # bytes of a member's own header before its name (APPNOTE.TXT, 4.3.7)


@frozen_record(eq=False)
class StoredArray:
    """One array in a file.

    Attributes:
        content: The file that holds it.
        offset: Byte of its first element.
        dtype: Type of an element.
        shape: Its shape without lengths of 1; ``()`` for a single element.
        fortran: Whether its first index runs fastest.
        n_promised: Rows that its header promises, where the file holds fewer.
    """

    content: Content
    offset: int
    dtype: np.dtype[Any]
    shape: tuple[int, ...]
    fortran: bool
    n_promised: int | None = None

    @property
    def size(self) -> int:
        """Number of elements."""
        return math.prod(self.shape)

    def load(self) -> NDArray[Any]:
        """Return the whole array."""
        with self.content.open() as file:
            file.seek(self.offset)
            data = file.read(self.size * self.dtype.itemsize)
        flat = np.frombuffer(data, self.dtype)
        return flat.reshape(self.shape, order="F" if self.fortran else "C")

    def columns(self, name: str) -> Iterator[tuple[str, StoredSamples]]:
        """Yield the channels in it by name: one, its fields, or those of a table."""
        item, offset = self.dtype.itemsize, self.offset
        if self.dtype.names is not None and len(self.shape) == 1:
            for field, (dtype, at, *_) in (self.dtype.fields or {}).items():
                if not dtype.shape:
                    yield field, self._row(offset + at, dtype, item, self.shape[0])
        elif len(self.shape) == 1:
            yield (
                f"{name} 1" if name == "column" else name,
                self._row(offset, self.dtype, item, self.shape[0]),
            )
        elif len(self.shape) == 2:
            n_rows, n_columns = self.shape
            turned = n_rows < n_columns and n_rows <= _WIDEST
            long, many = (n_columns, n_rows) if turned else (n_rows, n_columns)
            beside = self.fortran == turned  # whether the channels' samples stand beside each other
            stride, step = (many * item, item) if beside else (item, long * item)
            for k in range(many if many <= _WIDEST else 0):
                yield f"{name} {k + 1}", self._row(offset + k * step, self.dtype, stride, long)

    def _row(self, offset: int, dtype: np.dtype[Any], stride: int, size: int) -> StoredSamples:
        return StoredSamples(
            content=self.content, offset=offset, stored=dtype, stride=stride, size=size
        )


def find_arrays(content: Content) -> dict[str, StoredArray]:
    """Return the arrays of a file by name; a bare array has the name ``column``.

    Raises:
        MalformedCaptureError: If it is damaged or pickled, or would fill the disk.
    """
    try:
        with content.open() as file:
            if file.read(2) != b"PK":
                return {"column": _array(content, 0, content.size)}
            import zipfile

            with zipfile.ZipFile(file) as archive:
                _refuse_bomb(archive, content)
                names = [m for m in archive.infolist() if m.filename.endswith(".npy")]
                return {m.filename[:-4]: _member(archive, m, content) for m in names}
    except MalformedCaptureError:
        raise
    except Exception as error:  # of a damaged header numpy raises whatever its parser met
        raise _unreadable(content, str(error)) from error


def _refuse_bomb(archive: ZipFile, content: Content) -> None:
    """Refuse what would swell to a size that no capture has need of."""
    n_bytes = sum(member.file_size for member in archive.infolist())
    if n_bytes > max(_BOMB_BYTES, _BOMB_RATIO * content.size):
        raise MalformedCaptureError(
            f"{content.source} has {content.size} bytes and would unpack to {n_bytes}",
            hint="If it is a capture all the same, unpack it yourself and hand over the .npy file.",
            path=content.source,
            code="unpacks-too-large",
        )


def _member(archive: ZipFile, member: ZipInfo, content: Content) -> StoredArray:
    """Find an array in an archive: in place where it is stored, unpacked where it is not."""
    if member.compress_type == 0 and not member.flag_bits & 1:
        with content.open() as file:
            file.seek(member.header_offset + _LOCAL_HEADER - 4)
            lengths = file.read(4)
        at = member.header_offset + _LOCAL_HEADER
        at += int.from_bytes(lengths[:2], "little") + int.from_bytes(lengths[2:], "little")
        return _array(content, at, at + member.file_size)
    spool = Spool(IN_MEMORY_BYTES // 4)
    with archive.open(member) as packed:
        while chunk := packed.read(_CHUNK):
            spool.write(chunk)
    data, path = spool.finish()
    return _array(replace(content, data=data, path=path, size=spool.size), 0, spool.size)


def _array(content: Content, start: int, stop: int) -> StoredArray:
    """Read the header of the array that lies from ``start`` to ``stop``."""
    with content.open() as file:
        file.seek(start)
        shape, fortran, dtype = _header(file)
        offset = file.tell()
    if dtype.hasobject:
        raise _unreadable(content, "pickled objects")
    if not all(type(length) is int and length >= 0 for length in shape) or not dtype.itemsize:
        raise _unreadable(content, "a length below 0")
    kept = tuple(length for length in shape if length != 1)
    array = StoredArray(content=content, offset=offset, dtype=dtype, shape=kept, fortran=fortran)
    n_there = max(0, min(stop, content.size) - offset)
    return array if array.size * dtype.itemsize <= n_there else _whole_rows(array, n_there)


def _header(file: IO[bytes]) -> tuple[tuple[int, ...], bool, np.dtype[Any]]:
    version = np.lib.format.read_magic(file)
    if version == (1, 0):
        return np.lib.format.read_array_header_1_0(file)
    return np.lib.format.read_array_header_2_0(file)  # of version 3 only the names differ


def _whole_rows(array: StoredArray, n_bytes: int) -> StoredArray:
    """Return what is whole of a cut array: its first rows.

    Raises:
        MalformedCaptureError: If that is less than two rows, or they lie across the whole file.
    """
    across = array.fortran and len(array.shape) > 1
    n_rows = n_bytes // (array.dtype.itemsize * math.prod(array.shape[1:]) or 1)
    if across or n_rows < 2:
        raise _unreadable(array.content, "cut")
    return replace(array, shape=(n_rows, *array.shape[1:]), n_promised=array.shape[0])


def _unreadable(content: Content, reason: str) -> MalformedCaptureError:
    pickled = "pickle" in reason.lower()
    what = "holds pickled objects, which are never loaded" if pickled else "is cut or damaged"
    return MalformedCaptureError(
        f"{content.source} {what}",
        hint="Save plain numeric arrays with numpy.savez(time=…, samples=…).",
        path=content.source,
        code="pickled" if pickled else None,
    )
