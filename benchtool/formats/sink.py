"""Where writers write: a binary file object stays open, a path is opened and closed."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import BinaryIO

from benchtool.formats.content import input_error


@contextmanager
def opened(file: BinaryIO | Path) -> Iterator[BinaryIO]:
    """Give a binary file to write to.

    Raises:
        InputError: If a path cannot be written.
    """
    if not isinstance(file, Path):
        yield file
        return
    try:
        with file.open("wb") as stream:
            yield stream
    except OSError as error:
        raise input_error(error, str(file)) from error
