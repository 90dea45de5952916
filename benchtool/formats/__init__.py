"""Reading and writing captures: one module, or one folder of small ones, for each structure."""

from __future__ import annotations

from typing import TYPE_CHECKING

from benchtool.formats.claim import Claim, Format
from benchtool.formats.reading import FORMATS, read_capture

if TYPE_CHECKING:
    from benchtool.formats.counted import write_counted
    from benchtool.formats.npz import write_npz
    from benchtool.formats.text.writing import write_text
    from benchtool.formats.vcd.writing import write_vcd

__all__ = [
    "FORMATS",
    "Claim",
    "Format",
    "read_capture",
    "write_counted",
    "write_npz",
    "write_text",
    "write_vcd",
]

_WRITERS = {
    "write_counted": "benchtool.formats.counted",
    "write_npz": "benchtool.formats.npz",
    "write_text": "benchtool.formats.text.writing",
    "write_vcd": "benchtool.formats.vcd.writing",
}


def __getattr__(name: str) -> object:
    """Load a writer on first use: measuring needs none of them."""
    from importlib import import_module

    if name in _WRITERS:
        return getattr(import_module(_WRITERS[name]), name)
    raise AttributeError(f"module 'benchtool.formats' has no attribute {name!r}")
