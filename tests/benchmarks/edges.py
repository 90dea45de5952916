"""Edges and levels against a read pass and against the plain way; prints, asserts nothing.

A pass is ``max`` over the same samples; the plain way is a comparison, ``diff`` and
``flatnonzero`` over all of them, which knows no hysteresis, holes, times or uncertainty. All run in
turn on one core and are timed by the processor time of the process, so that a busy machine slows
all alike; of each the shortest counts.

    python tests/benchmarks/edges.py [MILLION_SAMPLES [ROUNDS]]
    python tests/benchmarks/edges.py --files MILLION_SAMPLES...

The second measures whole files of int8 codes in processes of their own: time and peak memory.
"""

from __future__ import annotations

import os
import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np

from benchtool.model.arrays import NDArray
from benchtool.model.capture import (
    ArraySamples,
    Capture,
    Origin,
    Scale,
    Span,
    UniformTime,
    Waveform,
)
from benchtool.timing import find_edges, find_levels, find_shapes
from benchtool.timing.crossings import find_crossings
from benchtool.timing.levels import levels_of
from benchtool.timing.survey import survey_samples
from benchtool.timing.thresholds import thresholds

Codes = NDArray[Any]

LOW, HIGH = -60, 60
SPARSE, DENSE = 2_000, 2_000_000  # edges in 100 million samples
TARGETS = {"int8": (0.30, 1.8), "int16": (0.40, 1.8), "float32": (0.40, 1.3)}


def noise(n: int, sd: float) -> NDArray[np.float64]:
    """Return noise whose first part repeats: drawing all of it would take longer than all else."""
    own = np.random.default_rng(1).normal(0, sd, 1 << 20)
    return np.resize(own, n)


def square(n: int, n_edges: int, dtype: str) -> Codes:
    """Return a square wave of uneven widths whose edges last three samples."""
    widths = np.random.default_rng(2).uniform(0.5, 1.5, n_edges + 1)
    at = np.cumsum(widths * n / (n_edges + 1))[:-1]
    corners = (at[:, None] + np.array([-1.5, 1.5])).ravel()
    levels = np.tile([LOW, HIGH, HIGH, LOW], n_edges // 2 + 1)[: corners.size]
    return _filled(n, dtype, lambda i: np.interp(i, corners, levels), 1.5)


def node(n: int, n_edges: int, dtype: str) -> Codes:
    """Return a slow exponential between a third and two thirds, crossing its middle with noise."""
    half = n / n_edges
    rate = np.log(2) / half

    def at(i: NDArray[np.float64]) -> NDArray[np.float64]:
        share = np.exp(-rate * (i % half))
        up = (i // half) % 2 == 0
        return np.where(up, 180 - 240 * share, 240 * share - 180)

    return _filled(n, dtype, at, 3.0)


def _filled(
    n: int,
    dtype: str,
    wave: Callable[[NDArray[np.float64]], NDArray[np.float64]],
    sd: float,
) -> Codes:
    values = np.empty(n, dtype)
    step = 1 << 20
    extra = noise(step, sd)
    for first in range(0, n, step):
        index = np.arange(first, min(n, first + step), dtype=np.float64)
        volts = wave(index) + extra[: index.size]
        values[first : first + step] = volts if dtype.startswith("f") else np.round(volts)
    return values


def as_trace(values: Codes) -> Waveform:
    """Return samples as a waveform of one span."""
    return Waveform(
        samples=ArraySamples(values),
        time=UniformTime(dt_s=1e-6),
        spans=(Span(start=0, stop=values.size, start_s=0.0),),
        channel="OUT",
        scale=Scale(gain=0.04),
    )


def plainly(values: Codes, mid: float) -> Codes:
    """Find changes of side the plain way."""
    return np.flatnonzero(np.diff(values > values.dtype.type(mid)))


def shortest(ways: dict[str, Callable[[], object]], rounds: int) -> dict[str, float]:
    """Return the least processor time of each way, all run in turn."""
    best = dict.fromkeys(ways, np.inf)
    for _ in range(rounds):
        for name, way in ways.items():
            start_s = time.process_time()
            way()
            best[name] = min(best[name], time.process_time() - start_s)
    return best


def traces(n: int) -> Iterator[tuple[str, str, Codes]]:
    """Yield wave by wave what is timed: its name, its type, its samples."""
    for dtype in TARGETS:
        yield "sparse", dtype, square(n, n * SPARSE // 100_000_000, dtype)
        yield "dense", dtype, square(n, n * DENSE // 100_000_000, dtype)
        yield "node", dtype, node(n, n * SPARSE // 100_000_000, dtype)


def ways_of(wave: str, values: Codes) -> dict[str, Callable[[], object]]:
    """Return what is timed of a wave; of a node the search alone, since its edges are turns."""
    trace = as_trace(values)
    levels = find_levels(trace)
    capture = Capture(traces=(trace,), origin=Origin(source="-", format="npz", sha256=""))
    limits = thresholds(trace, levels)
    search = partial(find_crossings, trace, limits)
    return {
        "pass": values.max,
        "search": search,
        "edges": search if wave == "node" else partial(find_edges, trace, levels),
        "plain": partial(plainly, values, limits.mid),
        "levels": lambda: levels_of(trace, survey_samples(trace)),
        "shapes": partial(find_shapes, capture),
    }


def compare(n: int, rounds: int) -> None:
    """Print the ratios of each wave."""
    print(f"{n / 1e6:g} M samples; ratios of processor time")
    print("wave    type     Msamples/s  of a pass    over plain    passes of")
    print("              edges (search)   (target)      (target)    levels  all shapes")
    for wave, dtype, values in traces(n):
        best = shortest(ways_of(wave, values), rounds)
        speed = [n / best[name] / 1e6 for name in ("edges", "search")]
        of_pass, over_plain = best["pass"] / best["edges"], best["plain"] / best["edges"]
        targets = [f"({x:.2f})" for x in TARGETS[dtype]]
        targets = [targets[0] if wave == "sparse" else "", targets[1] if wave == "dense" else ""]
        print(
            f"{wave:7} {dtype:8} {speed[0]:5.0f} ({speed[1]:5.0f})"
            f" {of_pass:7.2f} {targets[0]:6} {over_plain:7.2f} {targets[1]:6}"
            f" {best['levels'] / best['pass']:7.2f} {best['shapes'] / best['pass']:7.2f}"
        )


def write_codes(path: Path, n: int) -> None:
    """Write a file of int8 codes a part at a time: the same square wave over and over."""
    part = square(1 << 22, 84, "int8")
    with path.open("wb") as file:
        header = {"descr": "|i1", "fortran_order": False, "shape": (n,)}
        np.lib.format.write_array_header_1_0(file, header)
        for first in range(0, n, part.size):
            part[: n - first].tofile(file)


def measure_files(sizes: list[int]) -> None:
    """Print time and peak memory of measuring files, each in a process of its own."""
    print("Msamples     s  Msamples/s  peak MB")
    for n in sizes:
        with tempfile.TemporaryDirectory() as folder:
            path = Path(folder, "codes.npy")
            write_codes(path, n)
            command = [sys.executable, "-m", "benchtool", "measure", str(path)]
            start_s = time.perf_counter()
            child = os.posix_spawn(
                sys.executable, [*command, "--interval", "1us", "--json"], os.environ,
                file_actions=[(os.POSIX_SPAWN_OPEN, 1, os.devnull, os.O_WRONLY, 0)],
            )  # fmt: skip
            _, status, used = os.wait4(child, 0)
            taken_s = time.perf_counter() - start_s
        if status:
            raise SystemExit(f"measuring {n} samples failed")
        print(f"{n / 1e6:8g} {taken_s:5.1f} {n / taken_s / 1e6:11.0f} {used.ru_maxrss / 1024:8.0f}")


def main(arguments: list[str]) -> None:
    """Compare on a number of samples in memory, or measure files."""
    if arguments[:1] == ["--files"]:
        measure_files([int(word) * 1_000_000 for word in arguments[1:]])
        return
    sizes = [int(word) for word in arguments]
    compare((sizes[0] if sizes else 50) * 1_000_000, sizes[1] if len(sizes) > 1 else 5)


if __name__ == "__main__":
    main(sys.argv[1:])
