"""The design file: its structure, loading it with every fault and its line, writing and showing."""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

from benchtool.designs.reading import load_design, parse_design

if TYPE_CHECKING:
    from benchtool.designs.showing import show_rows
    from benchtool.designs.structure import design_schema
    from benchtool.designs.writing import NewDesign, write_design

__all__ = [
    "NewDesign",
    "design_schema",
    "load_design",
    "parse_design",
    "show_rows",
    "write_design",
]

_HOMES = {
    "NewDesign": "writing",
    "design_schema": "structure",
    "show_rows": "showing",
    "write_design": "writing",
}


def __getattr__(name: str) -> object:
    """Load what only the `design` verbs need on first use; judging needs loading alone."""
    if name in _HOMES:
        return getattr(import_module(f"benchtool.designs.{_HOMES[name]}"), name)
    raise AttributeError(f"module 'benchtool.designs' has no attribute {name!r}")
