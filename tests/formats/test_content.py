"""The edge to the file system: each reason not to read has its own code."""

from __future__ import annotations

import gzip
import hashlib
import io
import os
import sys
from pathlib import Path
from types import SimpleNamespace

import pytest
from read_back import Read, codes_of

from benchtool.errors import BenchtoolError, InputError, MalformedCaptureError
from benchtool.formats import read_capture
from benchtool.formats.content import open_content
from benchtool.formats.spool import Spool

TEXT = "time_s,OUT (V)\n" + "".join(f"{i * 0.005:.3f},{0.1 * (i % 9):.1f}\n" for i in range(4000))


def test_missing_file(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="does not exist") as caught:
        read_capture(tmp_path / "none.csv")
    assert caught.value.code == "no-such-file"


def test_file_below_a_file(tmp_path: Path) -> None:
    (tmp_path / "a.csv").write_text(TEXT)
    with pytest.raises(InputError) as caught:
        read_capture(tmp_path / "a.csv" / "b.csv")
    assert caught.value.code == "no-such-file"


def test_directory(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="directory") as caught:
        read_capture(tmp_path)
    assert caught.value.code == "is-directory"
    assert "one file" in caught.value.hint


def test_no_permission(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "a.csv"
    path.write_text(TEXT)
    path.chmod(0)
    if os.access(path, os.R_OK):  # the superuser may read anything

        def refuse(*_: object) -> None:
            raise PermissionError(13, "Permission denied")

        monkeypatch.setattr(Path, "open", refuse)
    with pytest.raises(InputError, match="may not be read") as caught:
        read_capture(path)
    assert caught.value.code == "no-permission"


def test_symbolic_link_to_itself(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.symlink_to(path)
    with pytest.raises(InputError, match="symbolic link") as caught:
        read_capture(path)
    assert caught.value.code == "symlink-loop"


def test_other_reasons_name_what_the_system_says(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fail(*_: object) -> None:
        raise OSError(5, "Input/output error")

    path = tmp_path / "a.csv"
    path.write_text(TEXT)
    monkeypatch.setattr(Path, "open", fail)
    with pytest.raises(InputError, match="Input/output error") as caught:
        read_capture(path)
    assert caught.value.code == "input"


@pytest.mark.parametrize("content", [b"", gzip.compress(b"", mtime=0)])
def test_empty_file(tmp_path: Path, content: bytes) -> None:
    path = tmp_path / "a.csv"
    path.write_bytes(content)
    with pytest.raises(MalformedCaptureError) as caught:
        read_capture(path)
    assert caught.value.code == "empty-file"


def test_format_nobody_knows(read: Read) -> None:
    with pytest.raises(BenchtoolError, match="parchment") as caught:
        read(TEXT, format="parchment")
    assert "text" in caught.value.hint


def test_named_format_is_not_sniffed(read: Read) -> None:
    assert read(TEXT, "a.vcd", format="text").origin.format == "text"


@pytest.mark.parametrize("limit", [1 << 20, 100])
def test_standard_input_is_read_like_a_file(monkeypatch: pytest.MonkeyPatch, limit: int) -> None:
    stream = SimpleNamespace(buffer=io.BytesIO(TEXT.encode()))
    monkeypatch.setattr(sys, "stdin", stream)
    capture = read_capture("-", in_memory_bytes=limit)
    assert capture.origin.source == "-"
    assert capture.origin.sha256 == hashlib.sha256(TEXT.encode()).hexdigest()
    assert capture.traces[0].samples.size == 4000  # type: ignore[union-attr]


def test_pipe_by_name(tmp_path: Path) -> None:
    import threading

    path = tmp_path / "pipe"
    os.mkfifo(path)
    writer = threading.Thread(target=path.write_bytes, args=(TEXT.encode(),))
    writer.start()
    assert read_capture(path).traces[0].samples.size == 4000  # type: ignore[union-attr]
    writer.join()


@pytest.mark.parametrize("limit", [1 << 20, 100])
def test_cut_gz_is_salvaged(read: Read, limit: int) -> None:
    stored = gzip.compress(TEXT.encode())
    capture = read(stored[: len(stored) // 2], "a.csv.gz", limit=limit)
    assert 500 < capture.traces[0].samples.size < 4000  # type: ignore[union-attr]
    assert "file-cut" in codes_of(capture)
    assert "bytes were read" in capture.warnings[0].text


def test_damaged_gz_is_salvaged(read: Read) -> None:
    stored = bytearray(gzip.compress(TEXT.encode(), compresslevel=0))
    stored[-5] ^= 0xFF  # the check sum
    capture = read(bytes(stored), "a.csv.gz")
    assert codes_of(capture) == ["gz-damaged"]
    assert capture.traces[0].samples.size == 4000  # type: ignore[union-attr]


def test_padding_behind_a_gz_is_no_damage(read: Read) -> None:
    assert codes_of(read(gzip.compress(TEXT.encode()) + bytes(512), "a.csv.gz")) == []


def test_gz_that_holds_nothing_readable(read: Read) -> None:
    with pytest.raises(MalformedCaptureError) as caught:
        read(gzip.compress(TEXT.encode())[:12], "a.csv.gz")
    assert caught.value.code == "empty-file"


def test_spool_goes_over_to_a_file() -> None:
    spool = Spool(10)
    for chunk in (b"mist", b"ing ", b"controller"):
        spool.write(chunk)
    data, path = spool.finish()
    assert data is None
    assert path is not None
    assert path.read_bytes() == b"misting controller"
    path.unlink()


def test_suffix_is_seen_through_gz(tmp_path: Path) -> None:
    path = tmp_path / "A.CSV.GZ"
    path.write_bytes(gzip.compress(TEXT.encode()))
    assert open_content(path).suffix == ".csv"
