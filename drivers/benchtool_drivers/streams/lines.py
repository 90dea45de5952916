"""One line as numbers: the way for lines that the fast way does not take."""

from __future__ import annotations

from benchtool.frozen import frozen_record
from benchtool_drivers.streams.layout import Layout
from benchtool_drivers.streams.lineformat import has_sum
from benchtool_drivers.streams.rows import MOST_DIGITS


@frozen_record
class Row:
    """What one line gave; the fields are those of ``Rows``."""

    seq: int
    ticks: int
    code: int
    decimals: int


def parse_line(line: bytes, layout: Layout) -> Row | None:
    """Return what a line gives, None where it is no line of this layout.

    Args:
        line: The line without LF.
        layout: What lines look like.
    """
    line = line.removesuffix(b"\r")
    if layout.xor_sum:
        if not has_sum(line):
            return None
        line = line[:-3]
    blank = layout.delimiter == b" "
    fields = line.split() if blank else line.split(layout.delimiter)
    if len(fields) != len(layout.columns):
        return None
    if layout.padded:
        fields = [field.strip() for field in fields]
    return _row(dict(zip(layout.columns, fields, strict=True)), layout)


def _row(fields: dict[str, bytes], layout: Layout) -> Row | None:
    seq = _whole(fields.get("seq", b"0"), layout.seq_bits)
    timed = _ticks(fields[layout.columns[layout.time_column]], layout)
    code = dict(layout.levels).get(fields["level"]) if "level" in fields else -1
    if seq is None or timed is None or code is None:
        return None
    return Row(seq=seq, ticks=timed[0], code=code, decimals=timed[1])


def _whole(text: bytes, bits: int) -> int | None:
    if not (text.isdigit() and len(text) <= MOST_DIGITS):
        return None
    value = int(text)
    return value if not bits or value < 1 << bits else None


def _ticks(text: bytes, layout: Layout) -> tuple[int, int] | None:
    """Return a time in ticks and with how many decimals it was printed."""
    if layout.unit_ticks == 1:
        value = _whole(text, layout.wrap_bits)
        return None if value is None else (value, 0)
    whole, mark, part = text.partition(layout.decimal)
    if mark and not part:
        return None
    value = _whole(whole + part, 0) if whole and len(text) <= MOST_DIGITS else None
    return None if value is None else scaled_time(value, len(part), layout)


def scaled_time(value: int, decimals: int, layout: Layout) -> tuple[int, int] | None:
    """Return a time printed with decimals in ticks; None beyond what 63 bits hold."""
    ticks = value * layout.unit_ticks // 10**decimals
    return (ticks, decimals) if ticks < 1 << 62 else None
