"""The end of a text file: whether its last line is whole."""

from __future__ import annotations

from benchtool.formats.content import Content
from benchtool.formats.text.cells import kind_of
from benchtool.formats.text.layout import Layout, is_comment
from benchtool.formats.text.lineends import with_newlines
from benchtool.model.quantity import Notice


def last_lines(content: Content, codec: str) -> list[str]:
    """Return the last lines of the file, the first of which may lack its beginning."""
    tail = with_newlines(content.tail(1 << 14))
    return tail.decode(codec, errors="replace").split("\n")


def find_cut(content: Content, layout: Layout, lines: list[str]) -> tuple[int, tuple[Notice, ...]]:
    """Return where the last whole row ends, and a notice if the file was cut inside a row."""
    last = lines[-1].rstrip("\0")
    if not last.strip() or is_comment(last) or not _is_cut(last, layout, lines[-40:-1]):
        return content.size, ()
    n_bytes = len(_last_line(content))
    notice = Notice(
        code="file-cut",
        text=f"the file ends inside a row ({last.strip()[:40]!r}); it was read to the row before",
    )
    return content.size - n_bytes, (notice,)


def _last_line(content: Content) -> bytes:
    tail = content.tail(1 << 14)
    return tail[max(tail.rfind(b"\n"), tail.rfind(b"\r")) + 1 :]


def _is_cut(last: str, layout: Layout, before: list[str]) -> bool:
    """Say whether a last line without its line end breaks off inside a row."""
    cells = layout.split(last)
    whole = [row for row in map(layout.split, before) if len(row) == layout.n_fields]
    if not cells or not cells[0] or not whole:
        return False
    kinds = [kind_of(cell, layout.decimal) for cell in cells]
    if len(cells) == 1 < layout.n_fields and kinds[0] == "T" and cells[0][0] not in "+-.0123456789":
        return False  # a footer
    if len(cells) < layout.n_fields:
        return bool(cells[0][0] in "+-.,0123456789" or kinds[0] in "NSW")
    if len(cells) > layout.n_fields:
        return False
    at = max(layout.fields)
    shapes = {_shape(row[at]) for row in whole}
    return kinds[at] in "ET" or (len(shapes) == 1 and _shape(cells[at]) < shapes.pop())


def _shape(cell: str) -> tuple[int, int]:
    """Return the lengths of a number's exponent and fraction."""
    mantissa, _, exponent = cell.lower().partition("e")
    digits = mantissa.replace(",", ".").partition(".")[2]
    return len(exponent), len(digits)
