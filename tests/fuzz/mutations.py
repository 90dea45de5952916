"""Changes that a structure survives: inside a shell, by lines, by cells, by known words."""

from __future__ import annotations

import gzip
import io
import random
import zipfile
import zlib
from collections.abc import Callable

Mutate = Callable[[bytes, int], bytes]

WORDS = [
    *(b"nan", b"NaN", b"inf", b"-inf", b"1e308", b"-1e308", b"5e-324", b"1e400", b"0x1F", b"1_0"),
    *(b"9" * 40, b"0.", b".5", b"-", b"--", b"+", b"1,234", b"1.234,5", b"OL", b"NULL", b""),
    *(b"Time (ms)", b"s", b"us", b"Sample interval,1e-6", b"Sample rate: 1 MHz", b"Date"),
    *(b"2031-03-02T03:12:00Z", b"1930000000.5", b"03:12:00.5", b"Increment", b"Start", b"X,Y"),
    *(b"\0\0\0\0", b"\xef\xbb\xbf", b"\xff\xfe", b"\xc0\x80", b"\x1b[31m", b"<b>", b'"', b"#"),
    *(
        b"\r",
        b"\r\n",
        b"\n\n",
        b";",
        b"\t",
        b"|",
        b" ",
        b",,",
        b"rising",
        b"high",
        b"0",
        b"1",
        b"x",
    ),
    *(
        b"$dumpoff\n",
        b"$dumpon\n",
        b"$end\n",
        b"#18446744073709551616\n",
        b"b1x0z !\n",
        b"r1e9 !\n",
    ),
    *(b"$timescale 1 ns $end\n", b"$comment ", b"#0\n", b"x!\n", b"RIFF", b"fmt ", b"data"),
]


def mutate(data: bytes, most: int, seed: int, plain: Mutate) -> bytes:
    """Change a file a little, inside its gz or zip shell where it has one.

    Args:
        data: The file.
        most: Bytes it may have.
        seed: Chooses the change.
        plain: Changes bytes without knowing what they are.
    """
    chance = random.Random(seed)
    if chance.random() < 0.9:
        if data.startswith(b"\x1f\x8b"):
            return _in_gz(data, most, chance, plain)
        if data.startswith(b"PK\x03\x04"):
            return _in_zip(data, most, chance, plain)
    return _changed(data, most, chance, plain)[:most]


def _changed(data: bytes, most: int, chance: random.Random, plain: Mutate) -> bytes:
    if chance.random() < 0.5:
        return plain(data, most)
    return chance.choice([_by_lines, _by_cells, _by_words])(data, chance)


def _in_gz(data: bytes, most: int, chance: random.Random, plain: Mutate) -> bytes:
    try:
        inner = zlib.decompressobj(wbits=31).decompress(data, 1 << 16)
    except zlib.error:
        return plain(data, most)
    return gzip.compress(_changed(inner, 1 << 16, chance, plain), 1, mtime=0)[:most]


def _in_zip(data: bytes, most: int, chance: random.Random, plain: Mutate) -> bytes:
    shell = io.BytesIO()
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as old, zipfile.ZipFile(shell, "w") as new:
            names = old.namelist()
            chosen = chance.choice(names)
            for name in names:
                inner = old.read(name)
                new.writestr(name, plain(inner, most) if name == chosen else inner)
    except Exception:  # a damaged shell fails in many ways; its bytes are then changed blindly
        return plain(data, most)
    return shell.getvalue()[:most]


def _by_lines(data: bytes, chance: random.Random) -> bytes:
    lines = data.splitlines(keepends=True) or [b"\n"]
    at, other = chance.randrange(len(lines)), chance.randrange(len(lines))
    few = chance.choice([1, 1, 2, 8])
    match chance.randrange(5):
        case 0:
            lines[at : at + few] = []
        case 1:
            lines[at:at] = lines[other : other + few]
        case 2:
            lines[at], lines[other] = lines[other], lines[at]
        case 3:
            lines = lines[at:] + lines[:at]
        case _:
            lines[at:at] = [chance.choice(WORDS) + b"\n"]
    return b"".join(lines)


def _by_cells(data: bytes, chance: random.Random) -> bytes:
    """Change one cell of a line, or the same cell of all lines."""
    delimiter = max([b",", b";", b"\t", b" "], key=data.count)
    lines = data.split(b"\n")
    at, field = chance.randrange(len(lines)), chance.randrange(4)
    word = chance.choice(WORDS)
    everywhere = chance.random() < 0.3
    for k in range(len(lines)) if everywhere else [at]:
        cells = lines[k].split(delimiter)
        if field < len(cells):
            cells[field : field + 1] = chance.choice([[word], [], [cells[field], word]])
        lines[k] = delimiter.join(cells)
    return b"\n".join(lines)


def _by_words(data: bytes, chance: random.Random) -> bytes:
    at = chance.randrange(len(data) + 1)
    width = chance.choice([0, 0, 1, 4, 16])
    return data[:at] + chance.choice(WORDS) + data[at + width :]
