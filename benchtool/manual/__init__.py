"""The manual that ``explain`` shows: words, figures, formulas, codes, faults, as data."""

from benchtool.manual.entries import Entry, entries, lookup, nearest

__all__ = ["Entry", "entries", "lookup", "nearest"]
