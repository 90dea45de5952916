"""Measure, solve and judge boards timed by a resistor and a capacitor.

``from benchtool import analyse`` is the whole way from a capture file to a verdict.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from benchtool.pipeline import analyse

__version__ = "0.1.0"
__all__ = ["__version__", "analyse"]


def __getattr__(name: str) -> object:
    """Load ``analyse`` on first use, so that ``benchtool --help`` needs no numpy."""
    if name == "analyse":
        from benchtool.pipeline import analyse

        return analyse
    raise AttributeError(f"module 'benchtool' has no attribute {name!r}")
