"""Values as people write them, and figures as people read them: "4k7", "100n", "22.18 s"."""

from benchtool.units.formatting import format_measured, format_value
from benchtool.units.parsing import parse, parse_tolerance

__all__ = ["format_measured", "format_value", "parse", "parse_tolerance"]
