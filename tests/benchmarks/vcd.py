"""VCD to edges against a bare line loop and general parsers; prints ratios, asserts nothing.

Each file is read by all ways in turn, several times, and the ratio is of the fastest of each, as
whatever else the machine does only adds. The line loop knows its file: one change a line, no
sections, times and states into lists. The general parsers are pyvcd's reader, token by token, and
vcdvcd where it is installed; they get a part of the file, as they take long, and their times are
scaled by bytes. Memory is the peak of a process of its own that does nothing but read the file.

    python tests/benchmarks/vcd.py [TRANSITIONS]
"""

from __future__ import annotations

import importlib.util
import os
import resource
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np

from benchtool.formats import read_capture
from benchtool.model.capture import LogicTrace

_HERE = str(Path(__file__).parent)
sys.path[:] = [each for each in sys.path if each != _HERE]  # it hides the package called vcd

N_TRANSITIONS = 2_000_000
N_RUNS = 5
PART = 20
HEAD = "$timescale 1 ns $end\n$scope module bench $end\n{}$upscope $end\n$enddefinitions $end\n"
BAR = "targets: lines 4, general 20"


def write_bits(path: Path, n: int, n_signals: int) -> int:
    """Write ``n`` changes of so many one-bit signals at random times; return the number."""
    rng = np.random.default_rng(n_signals)
    times = np.cumsum(rng.integers(20, 4000, n))
    which = rng.integers(0, n_signals, n)
    codes = [chr(33 + k) for k in range(n_signals)]
    states = [0] * n_signals
    declared = "".join(f"$var wire 1 {c} D{k} $end\n" for k, c in enumerate(codes))
    with path.open("w") as file:
        file.write(HEAD.format(declared) + "#0\n" + "".join(f"0{c}\n" for c in codes))
        for t, k in zip(times.tolist(), which.tolist(), strict=True):
            states[k] ^= 1
            file.write(f"#{t}\n{states[k]}{codes[k]}\n")
    return n


def write_bus(path: Path, n: int) -> int:
    """Write ``n`` changes: a bit, and beside it a bus of eight that counts."""
    rng = np.random.default_rng(1)
    times = np.cumsum(rng.integers(20, 4000, n // 2))
    declared = "$var wire 1 ! OUT $end\n$var wire 8 # count [7:0] $end\n"
    with path.open("w") as file:
        file.write(HEAD.format(declared) + "#0\n0!\nb0 #\n")
        for i, t in enumerate(times.tolist(), 1):
            file.write(f"#{t}\n{i % 2}!\nb{i % 256:b} #\n")
    return n


def read_lines(path: Path) -> dict[str, tuple[list[int], list[str]]]:
    """Read by lines, with nothing checked."""
    changes: dict[str, tuple[list[int], list[str]]] = {}
    now = 0
    with path.open() as file:
        for line in file:
            if line.startswith("$enddefinitions"):
                break
            if line.startswith("$var"):
                changes[line.split()[3]] = ([], [])
        for line in file:
            first = line[0]
            if first == "#":
                now = int(line[1:])
            elif first in "01xz":
                times, states = changes[line[1:-1]]
                times.append(now)
                states.append(first)
            elif first == "b":
                value, code = line[1:].split()
                times, states = changes[code]
                times.append(now)
                states.append(value)
    return changes


def read_tokens(path: Path) -> int:
    """Read with pyvcd's reader."""
    from vcd.reader import tokenize

    with path.open("rb") as file:
        return sum(1 for _ in tokenize(file))


def read_vcdvcd(path: Path) -> object:
    """Read with vcdvcd."""
    from vcdvcd import VCDVCD

    return VCDVCD(str(path), store_tvs=True)


def part_of(path: Path) -> Path:
    """Write the first part of a file beside it."""
    data = path.read_bytes()[: path.stat().st_size // PART]
    part = path.with_suffix(".part.vcd")
    part.write_bytes(data[: data.rfind(b"\n#") + 1])
    return part


def seconds(read: Callable[[Path], object], path: Path) -> float:
    """Return how long one reading takes."""
    start_s = time.perf_counter()
    read(path)
    return time.perf_counter() - start_s


def compare(path: Path, n: int) -> None:
    """Time all ways on one file and print the ratios."""
    part = part_of(path)
    scale = path.stat().st_size / part.stat().st_size
    ways: dict[str, tuple[Callable[[Path], object], Path, float]] = {
        "ours": (read_capture, path, 1.0),
        "lines": (read_lines, path, 1.0),
        "pyvcd": (read_tokens, part, scale),
    }
    if importlib.util.find_spec("vcdvcd"):
        ways["vcdvcd"] = (read_vcdvcd, part, scale)
    taken_s: dict[str, list[float]] = {name: [] for name in ways}
    for _ in range(N_RUNS):
        for name, (read, file, times) in ways.items():
            taken_s[name].append(times * seconds(read, file))
    best_s = {name: min(each) for name, each in taken_s.items()}
    ratios = "  ".join(f"{name} {best_s[name] / best_s['ours']:.1f}x" for name in [*ways][1:])
    rate = n / best_s["ours"] / 1e6
    print(f"{path.stem:<12} {rate:.1f} Mtransitions/s   against {ratios}   ({BAR})")


def peak(path: Path) -> None:
    """Read a file and print the peak memory of this process, and the edges of all its traces."""
    traces = read_capture(path).traces
    edges = sum(trace.times_s.size for trace in traces if isinstance(trace, LogicTrace))
    rss_mb = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    room_mb = 200 + 32 * edges / 2**20
    size_mb = path.stat().st_size / 2**20
    print(f"{'':<12} peak {rss_mb:.0f} MiB of {room_mb:.0f}, {edges} edges, file {size_mb:.0f} MiB")


def main(n: int) -> None:
    """Write the files, time them and weigh them."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        for stem, write in (
            ("one bit", lambda p: write_bits(p, n, 1)),
            ("eight bits", lambda p: write_bits(p, n, 8)),
            ("bit and bus", lambda p: write_bus(p, n)),
        ):
            path = folder / f"{stem}.vcd"
            compare(path, write(path))
            command = [sys.executable, __file__, "--peak", str(path)]
            subprocess.run(command, check=True, env=dict(os.environ))
            path.unlink()


if __name__ == "__main__":
    if sys.argv[1:2] == ["--peak"]:
        peak(Path(sys.argv[2]))
    else:
        main(int(sys.argv[1]) if len(sys.argv) > 1 else N_TRANSITIONS)
