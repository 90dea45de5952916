"""Faults and findings: what is seen in a trace, what can cause it, and which part has moved."""

from __future__ import annotations

from typing import TYPE_CHECKING

from benchtool.diagnose.findings import find_findings, flat_length, flat_state

if TYPE_CHECKING:
    from benchtool.diagnose.engine import diagnose

__all__ = ["diagnose", "find_findings", "flat_length", "flat_state"]


def __getattr__(name: str) -> object:
    if name == "diagnose":  # measuring needs findings alone, and starts without the circuit model
        from benchtool.diagnose.engine import diagnose

        return diagnose
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
