"""Dialect files: how an instrument is spoken to, as data.

A dialect is a TOML file of enumerated forms: which commands arm, ask and abort, where the figures
of the preamble stand, how samples are coded and scaled. It holds no expressions, and nothing in it
is ever evaluated. ``load_dialect`` reads one with every fault and its line; ``known_dialects``
finds the bundled ones and the user's own.
"""

from benchtool_drivers.dialect.loading import load_dialect, parse_dialect
from benchtool_drivers.dialect.places import find_dialect, known_dialects
from benchtool_drivers.dialect.records import Dialect

__all__ = ["Dialect", "find_dialect", "known_dialects", "load_dialect", "parse_dialect"]
