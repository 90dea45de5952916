"""Damaged dumps, archives and sounds: what is whole is read right, what is not is counted."""

from __future__ import annotations

import gzip
import io
import struct
import wave
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from damage import DT_S, HIGH_S, LOW_S, N, measured, volts

Capsys = pytest.CaptureFixture[str]

HEADER = (
    "$timescale 1 ms $end\n$scope module mist $end\n"
    "$var wire 1 ! OUT $end\n$upscope $end\n$enddefinitions $end\n"
)
FIRST_MS = 2000
EDGES_MS = np.cumsum([FIRST_MS, *([int(HIGH_S * 1e3), int(LOW_S * 1e3)] * 12)]).tolist()


def changes(times_ms: list[int] = EDGES_MS) -> list[str]:
    """Return the changes of the wave: high from the first edge on."""
    return ["#0\n0!\n", *(f"#{t}\n{1 - k % 2}!\n" for k, t in enumerate(times_ms))]


def dump(body: list[str], header: str = HEADER) -> bytes:
    return (header + "".join(body)).encode()


DUMP = dump(changes())


def archive(**arrays: Any) -> bytes:
    shell = io.BytesIO()
    np.savez(shell, **arrays)
    return shell.getvalue()


def single(array: np.ndarray) -> bytes:
    shell = io.BytesIO()
    np.save(shell, array)
    return shell.getvalue()


T_S = np.arange(N) * DT_S
V = np.array([volts(k) for k in range(N)])


def with_value(value: float, at: int = 100, of: np.ndarray = V) -> np.ndarray:
    changed = of.astype(np.float64)
    changed[at] = value
    return changed


def sound(frames: bytes, *, bits: int = 16, n_channels: int = 1) -> bytes:
    """Return a WAVE file of two samples a second."""
    shell = io.BytesIO()
    with wave.open(shell, "wb") as file:
        file.setparams((n_channels, bits // 8, 2, 0, "NONE", ""))
        file.writeframes(frames)
    return shell.getvalue()


CODES = (V * 1000).astype("<i2").tobytes()
SOUND = sound(CODES)


def float_sound(values: np.ndarray) -> bytes:
    data = values.astype("<f4").tobytes()
    form = struct.pack("<HHIIHH", 3, 1, 2, 8, 4, 32)
    body = (
        b"WAVEfmt " + struct.pack("<I", 16) + form + b"data" + struct.pack("<I", len(data)) + data
    )
    return b"RIFF" + struct.pack("<I", len(body)) + body


READ: Mapping[str, tuple[str, bytes, list[str]]] = {
    "whole dump": ("a.vcd", DUMP, []),
    "dump with a NUL tail": ("a.vcd", DUMP + bytes(4096), ["zero bytes"]),
    "dump cut in a change": ("a.vcd", DUMP[:-2], ["file-cut"]),
    "dump cut in a time": ("a.vcd", DUMP[:-6], ["file-cut"]),
    "dump of CR LF": ("a.vcd", DUMP.replace(b"\n", b"\r\n"), []),
    "dump of CR": ("a.vcd", DUMP.replace(b"\n", b"\r"), []),
    "dump on one line": ("a.vcd", DUMP.replace(b"\n", b" "), []),
    "dump marked as UTF-8": ("a.vcd", b"\xef\xbb\xbf" + DUMP, []),
    "dump with a long comment": (
        "a.vcd",
        HEADER.encode() + b"$comment " + b"x" * 1_000_000 + b" $end\n" + DUMP[len(HEADER) :],
        [],
    ),
    "dump of a huge vector beside": (
        "a.vcd",
        dump(
            ["b" + "1" * 200_000 + " #\n", *changes()],
            HEADER.replace("$upscope", "$var wire 200000 # wide $end\n$upscope"),
        ),
        ["signals-skipped"],
    ),
    "dump in gz, cut": ("a.vcd.gz", gzip.compress(DUMP, mtime=0)[:-12], ["file-cut"]),
    "archive": ("a.npz", archive(time=T_S, OUT=V), []),
    "archive with one infinity": (
        "a.npz",
        archive(time=T_S, OUT=with_value(np.inf)),
        ["missing-samples: 1 of 600"],
    ),
    "archive with one NaN": (
        "a.npz",
        archive(time=T_S, OUT=with_value(np.nan)),
        ["missing-samples: 1 of 600"],
    ),
    "archive with one huge value": (
        "a.npz",
        archive(time=T_S, OUT=with_value(1e308)),
        ["missing-samples: 1 of 600"],
    ),
    "archive with subnormal lows": (
        "a.npz",
        archive(time=T_S, OUT=np.where(V == 0, 5e-324, V)),
        [],
    ),
    "archive with one time lost": (
        "a.npz",
        archive(time=with_value(np.nan, of=T_S), OUT=V),
        ["gaps: 1 samples"],
    ),
    "archive with one time infinite": (
        "a.npz",
        archive(time=with_value(np.inf, of=T_S), OUT=V),
        ["gaps: 1 samples"],
    ),
    "archive with one time huge": (
        "a.npz",
        archive(time=with_value(1e300, of=T_S), OUT=V),
        ["gaps: 1 samples"],
    ),
    "archive of times in 8 bits": (
        "a.npz",
        archive(time_s=np.arange(-100, 101).astype("i1"), OUT=V[:402:2]),
        [],
    ),
    "archive of halves": ("a.npz", archive(time=T_S, OUT=V.astype("f2") * np.float16(100)), []),
    "array, big-endian": ("a.npy", single(np.column_stack([T_S, V]).astype(">f8")), []),
    "array, Fortran order": ("a.npy", single(np.asfortranarray(np.column_stack([T_S, V]))), []),
    "array cut": (
        "a.npy",
        single(np.column_stack([T_S, V]))[:-100],
        ["file-cut: the header of", "promises 600 rows", "the file holds 593"],
    ),
    "whole sound": ("a.wav", SOUND, []),
    "sound cut in its data": ("a.wav", SOUND[:-101], ["file-cut: the header promises 600 samples"]),
    "sound of unknown length": ("a.wav", SOUND[:40] + b"\xff\xff\xff\xff" + SOUND[44:], []),
    "sound of length zero": ("a.wav", SOUND[:40] + b"\0\0\0\0" + SOUND[44:], []),
    "float sound": ("a.wav", float_sound(V), []),
    "float sound with one NaN": (
        "a.wav",
        float_sound(with_value(np.nan)),
        ["missing-samples: 1 of 600"],
    ),
    "float sound with one infinity": (
        "a.wav",
        float_sound(with_value(np.inf)),
        ["missing-samples: 1 of 600"],
    ),
    "float sound with one huge value": (
        "a.wav",
        float_sound(with_value(3e38)),
        ["missing-samples: 1 of 600"],
    ),
}


@pytest.mark.parametrize("name", READ)
def test_what_is_whole_is_measured_right_and_the_rest_is_counted(
    capsys: Capsys, tmp_path: Path, name: str
) -> None:
    file, content, says = READ[name]
    (tmp_path / file).write_bytes(content)
    end = measured(capsys, tmp_path / file)
    assert end.code == 0, end.document
    for words in says:
        assert words in end.said
    end.demand_truth()
    if not says:
        assert "cut" not in end.said
        assert "missing" not in end.said


REFUSED: Mapping[str, tuple[str, bytes, int, str]] = {
    "dump cut in its header": ("a.vcd", DUMP[:60], 4, "header-cut"),
    "dump of a header alone": ("a.vcd", HEADER.encode(), 4, "no-values"),
    "dump without a timescale": (
        "a.vcd",
        DUMP.replace(b"$timescale 1 ms $end\n", b""),
        2,
        "no-timescale",
    ),
    "two dumps": ("a.vcd", DUMP + DUMP, 4, "malformed-capture"),
    "dump whose time steps back": ("a.vcd", dump(changes([5000, 4000, 6000])), 4, "time-disorder"),
    "dump that never changes": ("a.vcd", dump(["#0\n1!\n", "#9000\n"]), 4, "no-interval"),
    "dump of a time of 400 digits": (
        "a.vcd",
        dump([*changes(), "#" + "9" * 400 + "\n1!\n"]),
        4,
        "malformed-capture",
    ),
    "dump with a foreign word": (
        "a.vcd",
        dump([*changes()[:9], "hello\n", *changes()[9:]]),
        4,
        "malformed-capture",
    ),
    "archive cut": ("a.npz", archive(time=T_S, OUT=V)[:-200], 4, "malformed-capture"),
    "archive of nothing": ("a.npz", archive(), 4, "no-values"),
    "archive of words": ("a.npz", archive(OUT=np.array(["high", "low"])), 4, "no-values"),
    "archive of objects": ("a.npz", archive(OUT=np.array([{}, {}])), 4, "pickled"),
    "archive of two lengths": ("a.npz", archive(time=T_S, OUT=V[:-1]), 4, "malformed-capture"),
    "archive whose times are NaN": (
        "a.npz",
        archive(time=T_S * np.nan, OUT=V),
        4,
        "malformed-capture",
    ),
    "archive whose times run backwards": (
        "a.npz",
        archive(time=T_S[::-1], OUT=V),
        4,
        "time-disorder",
    ),
    "archive whose times are booleans": ("a.npz", archive(time=V > 6, OUT=V), 4, "no-interval"),
    "archive of all NaN": ("a.npz", archive(time=T_S, OUT=V * np.nan), 4, "no-samples"),
    "archive of ours whose states lack": (
        "a.npz",
        archive(times=T_S, states=V[:5] > 6, spans=[[0, 300, 0]]),
        4,
        "malformed-capture",
    ),
    "archive of ours whose transitions lie outside": (
        "a.npz",
        archive(times=[1.0, 2.0], states=[1, 0], spans=[[5, 5, 0]]),
        4,
        "malformed-capture",
    ),
    "archive of ours whose pieces overlap": (
        "a.npz",
        archive(samples=V, dt=0.5, spans=[[0, 300, 0], [200, 600, 100]]),
        4,
        "malformed-capture",
    ),
    "archive of ours whose interval is infinite": (
        "a.npz",
        archive(samples=V, dt=np.inf),
        4,
        "malformed-capture",
    ),
    "array cut in its header": ("a.npy", single(V)[:30], 4, "malformed-capture"),
    "array of one number": ("a.npy", single(np.array(3.0)), 4, "no-values"),
    "array without time": ("a.npy", single(V), 2, "no-time"),
    "sound cut in its header": ("a.wav", SOUND[:16], 4, "header-cut"),
    "sound without data": ("a.wav", SOUND[:36], 4, "header-cut"),
    "sound of no samples": ("a.wav", sound(b""), 4, "no-rows"),
    "sound of no channels": ("a.wav", SOUND[:22] + b"\0\0" + SOUND[24:], 4, "malformed-capture"),
    "sound of no rate": ("a.wav", SOUND[:24] + b"\0\0\0\0" + SOUND[28:], 4, "malformed-capture"),
    "sound of another coding": (
        "a.wav",
        SOUND[:20] + b"\x55\0" + SOUND[22:],
        4,
        "malformed-capture",
    ),
    "float sound of all NaN": ("a.wav", float_sound(V * np.nan), 4, "no-samples"),
}


@pytest.mark.parametrize("name", REFUSED)
def test_what_cannot_be_measured_is_one_clear_error(
    capsys: Capsys, tmp_path: Path, name: str
) -> None:
    file, content, code, error = REFUSED[name]
    (tmp_path / file).write_bytes(content)
    end = measured(capsys, tmp_path / file)
    assert (end.code, end.error) == (code, error), end.document


def test_members_of_an_archive_that_are_no_arrays_are_left_out(
    capsys: Capsys, tmp_path: Path
) -> None:
    import zipfile

    path = tmp_path / "a.npz"
    path.write_bytes(archive(time=T_S, OUT=V))
    with zipfile.ZipFile(path, "a") as shell:
        shell.writestr("notes.txt", "as measured on the bench")
    end = measured(capsys, path)
    assert end.code == 0
    end.demand_truth()
