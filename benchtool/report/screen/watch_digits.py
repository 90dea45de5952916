"""Figures large enough to be read from across the bench, in plain characters."""

from __future__ import annotations

ROWS = 7

_INK = "#"
_GLYPHS: dict[str, tuple[str, ...]] = {
    "0": (" #### ", "##  ##", "##  ##", "##  ##", "##  ##", "##  ##", " #### "),
    "1": ("   ## ", " #### ", "   ## ", "   ## ", "   ## ", "   ## ", "   ## "),
    "2": (" #### ", "##  ##", "    ##", "   ## ", "  ##  ", " ##   ", "######"),
    "3": (" #### ", "##  ##", "    ##", "  ### ", "    ##", "##  ##", " #### "),
    "4": ("    ##", "   ###", "  # ##", " #  ##", "######", "    ##", "    ##"),
    "5": ("######", "##    ", "##### ", "    ##", "    ##", "##  ##", " #### "),
    "6": ("  ### ", " ##   ", "##    ", "##### ", "##  ##", "##  ##", " #### "),
    "7": ("######", "    ##", "    ##", "   ## ", "  ##  ", "  ##  ", "  ##  "),
    "8": (" #### ", "##  ##", "##  ##", " #### ", "##  ##", "##  ##", " #### "),
    "9": (" #### ", "##  ##", "##  ##", " #####", "    ##", "   ## ", " ###  "),
    ".": ("  ", "  ", "  ", "  ", "  ", "##", "##"),
    "-": ("    ", "    ", "    ", "####", "    ", "    ", "    "),
    ">": ("##   ", " ##  ", "  ## ", "   ##", "  ## ", " ##  ", "##   "),
    "<": ("   ##", "  ## ", " ##  ", "##   ", " ##  ", "  ## ", "   ##"),
    "%": ("##   #", "##  ##", "   ## ", "  ##  ", " ##   ", "##  ##", "#   ##"),
    "s": ("      ", "      ", " #####", "##    ", " #### ", "    ##", "##### "),
    "m": ("        ", "        ", "### ### ", "## ## ##", "## ## ##", "## ## ##", "## ## ##"),
    "µ": ("      ", "      ", "##  ##", "##  ##", "##  ##", "##### ", "##    "),
    "n": ("      ", "      ", "##### ", "##  ##", "##  ##", "##  ##", "##  ##"),
    "k": ("##    ", "##    ", "##  ##", "## ## ", "####  ", "## ## ", "##  ##"),
    "M": ("##   ##", "### ###", "#######", "## # ##", "##   ##", "##   ##", "##   ##"),
    "H": ("##  ##", "##  ##", "##  ##", "######", "##  ##", "##  ##", "##  ##"),
    "z": ("      ", "      ", "######", "   ## ", "  ##  ", " ##   ", "######"),
    "p": ("      ", "      ", "##### ", "##  ##", "##### ", "##    ", "##    "),
    " ": ("   ",) * ROWS,
}
_UNKNOWN = ("      ",) * 3 + ("######",) + ("      ",) * 3


def enlarge(text: str, width: int, *, ink: str = _INK, scale: int = 1) -> tuple[str, ...]:
    """Return a figure in large characters, without its unit where there is no room for both.

    Args:
        text: A figure with its unit, "24.770 s".
        width: Columns there are.
        ink: What the strokes are made of.
        scale: How many times larger than ``ROWS`` rows it may be.

    Returns:
        The rows; a single row of plain text where even the figure alone is too wide.
    """
    number, _, unit = text.partition(" ")
    for size in range(scale, 0, -1):
        rows = _rows(text, size)
        if len(rows[0]) <= width:
            return tuple(row.replace(_INK, ink).rstrip() for row in rows)
    rows = _rows(number, 1)
    if unit and len(rows[0]) + 1 + len(unit) <= width:
        rows[-1] += f" {unit}"
        return tuple(row.replace(_INK, ink).rstrip() for row in rows)
    return (text,)


def _rows(text: str, size: int) -> list[str]:
    glyphs = [_GLYPHS.get(char, _UNKNOWN) for char in text]
    gap = " " * 2
    rows = [gap.join(glyph[i] for glyph in glyphs) for i in range(ROWS)]
    return ["".join(char * size for char in row) for row in rows for _ in range(size)]
