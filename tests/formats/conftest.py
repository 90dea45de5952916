"""Files with known content, read as captures."""

from __future__ import annotations

from pathlib import Path

import pytest
from read_back import Read

from benchtool.formats import read_capture
from benchtool.model.capture import Capture, ReadOptions


@pytest.fixture
def read(tmp_path: Path) -> Read:
    """Write bytes or text to a file and read it as a capture."""

    def write_and_read(
        content: str | bytes, name: str = "capture.csv", *, limit: int = 1 << 20, **options: object
    ) -> Capture:
        path = tmp_path / name
        path.write_bytes(content.encode() if isinstance(content, str) else content)
        return read_capture(path, ReadOptions(**options), in_memory_bytes=limit)  # type: ignore[arg-type]

    return write_and_read
