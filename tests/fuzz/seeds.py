"""Small whole files of every structure, from which the fuzzing run starts."""

from __future__ import annotations

import gzip
import io
import wave
from pathlib import Path

import numpy as np

TESTS = Path(__file__).parents[1]
MOST_BYTES = 5000


def write_seeds(folder: Path) -> int:
    """Write the seeds into a folder and return how many there are."""
    malformed = [p.read_bytes() for p in sorted((TESTS / "malformed").iterdir()) if p.is_file()]
    samples = [_first_lines(p) for p in sorted((TESTS.parent / "sample_captures").iterdir())]
    seeds = [s for s in [*malformed, *samples, *_texts(), *_arrays(), *_sounds(), *_dumps()] if s]
    for k, seed in enumerate(seeds):
        (folder / f"seed{k:03d}").write_bytes(seed[:MOST_BYTES])
    return len(seeds)


def _first_lines(path: Path) -> bytes:
    if path.suffix not in (".csv", ".tsv", ".txt", ".vcd"):
        return b""
    return b"\n".join(path.read_bytes()[:MOST_BYTES].split(b"\n")[:60]) + b"\n"


def _wave_v(n: int = 60) -> list[float]:
    return [5.0 if k % 12 < 7 else 0.0 for k in range(n)]


def _texts() -> list[bytes]:
    v = _wave_v()
    plain = "".join(f"{k * 0.5:.1f},{x:.2f}\n" for k, x in enumerate(v))
    european = plain.replace(",", ";").replace(".", ",")
    stamped = "".join(f"2031-03-02T03:12:{k * 0.5:06.3f}Z,{x}\n" for k, x in enumerate(v))
    pairs = "".join(f"{k},{x},{k * 2},{5 - x}\n" for k, x in enumerate(v))
    words = "".join(
        f"{k * 0.37 + k % 2 * 0.1:.3f},{'high' if k % 2 else 'low'}\n" for k in range(30)
    )
    texts = [
        "Time (ms),OUT (V)\n" + plain,
        "Zeit (ms);Kanal 1 (V)\n" + european,
        "Sample interval,5e-4\nUnits,V\n\nOUT\n" + "".join(f"{x}\n" for x in v),
        "Timestamp,OUT\n,V\n" + stamped,
        "t1 (us),A (V),t2 (us),B (V)\n" + pairs,
        "time [s],state\n" + words,
        "x,CH1,Start,Increment\nSequence,Volt,0.0,1e-6\n"
        + "".join(f"{k},{x},,\n" for k, x in enumerate(v)),
        '"Time";"OUT"\n"s";"V"\n' + "".join(f'"{k}";"{x}"\n' for k, x in enumerate(v)),
        "Index Time(us) OUT(V)\n"
        + "".join(f"{k:>6} {k * 2:>8} {x:>8.3f}\n" for k, x in enumerate(v)),
    ]
    first = texts[0].encode()
    wide = [texts[0].encode("utf-16"), first.replace(b"\n", b"\r\n"), first.replace(b"\n", b"\r")]
    return [*(t.encode() for t in texts), *wide, gzip.compress(first, mtime=0)]


def _arrays() -> list[bytes]:
    v = np.array(_wave_v())
    files = []
    for arrays in (
        {"time": np.arange(60) * 1e-3, "OUT": v},
        {"samples": v.astype(np.int16), "dt": 1e-3, "gain": 0.1, "channel": "OUT"},
        {
            "times": np.array([0.1, 0.2, 0.5]),
            "states": np.array([1, 0, 1]),
            "spans": np.ones((1, 3)),
        },
        {"sample_rate": 1e3, "CH1": v.astype(np.int8), "CH2": v > 2},
    ):
        shell = io.BytesIO()
        np.savez(shell, **arrays)
        files.append(shell.getvalue())
    for array in (v, np.column_stack([np.arange(60) * 1e-3, v]), v.astype(">i2"), v.astype("f2")):
        shell = io.BytesIO()
        np.save(shell, array)
        files.append(shell.getvalue())
    return files


def _sounds() -> list[bytes]:
    files = []
    for width, channels in ((1, 1), (2, 2), (3, 1), (4, 1)):
        shell = io.BytesIO()
        with wave.open(shell, "wb") as sound:
            sound.setparams((channels, width, 8000, 0, "NONE", ""))
            sound.writeframes(bytes(200 * width * channels))
        files.append(shell.getvalue())
    return files


def _dumps() -> list[bytes]:
    head = (
        b"$version made $end\n$timescale 10 us $end\n$scope module mist $end\n"
        b"$var wire 1 ! OUT $end\n$var wire 4 # bus [3:0] $end\n$var real 64 % node $end\n"
        b"$var wire 1 ! OUT_B $end\n$upscope $end\n$enddefinitions $end\n"
    )
    start = b"#0\n$dumpvars\n0!\nb0000 #\nr1.5 %\n$end\n"
    body = b"".join(
        b"#%d\n%d!\nb1%dx #\nr%d.5 %%\n" % (k * 7, k % 2, k % 2, k % 3) for k in range(1, 30)
    )
    return [head + start + body, head + start + body[:200] + b"$dumpoff\nx!\n$end\n" + body[200:]]
