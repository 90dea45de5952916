"""What parts are marked with, and the values they come in."""

from benchtool.parts.markings import decode, split_markings
from benchtool.parts.series import SERIES, is_preferred, nearest, neighbours, series_of, values

__all__ = [
    "SERIES",
    "decode",
    "is_preferred",
    "nearest",
    "neighbours",
    "series_of",
    "split_markings",
    "values",
]
