"""Whole-process times against reading the same file with pandas; prints ratios, asserts nothing.

Runs alternate, so that a busy machine slows both; each ratio is of two neighbours, and the median
of the ratios is printed beside the target. Bytecode is kept in a folder of its own, made by a first
run that does not count, as on a machine where both are installed.

    python tests/benchmarks/start_up.py [RUNS]
"""

from __future__ import annotations

import os
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

from captures import DESIGN, write_square

RUNS = 15
TARGETS = {"--help": 0.20, "measure --json": 0.6, "judge --json": 0.6}


def seconds(command: list[str], folder: Path) -> float:
    """Return how long a process takes from start to end."""
    kept = {"PYTHONDONTWRITEBYTECODE": "", "PYTHONPYCACHEPREFIX": str(folder / "bytecode")}
    start_s = time.perf_counter()
    subprocess.run(command, stdout=subprocess.DEVNULL, env={**os.environ, **kept}, check=True)
    return time.perf_counter() - start_s


def commands(folder: Path) -> tuple[dict[str, list[str]], list[str]]:
    """Write the file of 20,000 rows and its design; return what is timed, and what against."""
    capture = write_square(folder / "capture.csv", n_samples=20_000, dt_s=0.0075)
    design = folder / "mist.toml"
    design.write_text(DESIGN)
    ours = [sys.executable, "-m", "benchtool"]
    timed = {
        "--help": [*ours, "--help"],
        "measure --json": [*ours, "measure", str(capture), "--json"],
        "judge --json": [*ours, "judge", str(capture), "--design", str(design), "--json"],
    }
    return timed, [sys.executable, "-c", f"import pandas; pandas.read_csv({str(capture)!r})"]


def main(runs: int) -> None:
    """Time all commands in turn and print the ratios."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        timed, against = commands(folder)
        for command in (*timed.values(), against):  # once before it counts
            seconds(command, folder)
        ratios: dict[str, list[float]] = {verb: [] for verb in timed}
        pandas_s: list[float] = []
        for _ in range(runs):
            for verb, command in timed.items():
                pandas_s.append(seconds(against, folder))
                ratios[verb].append(seconds(command, folder) / pandas_s[-1])
    print(f"pandas.read_csv, whole process: {statistics.median(pandas_s):.3f} s (median)")
    for verb, found in ratios.items():
        low, middle, high = np.quantile(found, [0.25, 0.5, 0.75])
        print(f"{verb:<16} {middle:.2f}  ({low:.2f} to {high:.2f})  target {TARGETS[verb]:.2f}")


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else RUNS)
