"""The usual cautions, once before the first live connection of a run."""

from __future__ import annotations

import sys
import textwrap

from benchtool.cli.output import Output

_TOLD: list[bool] = []
_WIDTH = 78


def tell_cautions(output: Output) -> None:
    """Say the cautions on stderr before the first live connection of a run; by --quiet never."""
    if _TOLD or output.quiet:
        return
    from benchtool.report.page.cautions import CAUTIONS

    _TOLD.append(True)
    said = textwrap.fill(f"Caution: {CAUTIONS}", _WIDTH, subsequent_indent="  ")
    sys.stderr.write(f"{said}\n")
