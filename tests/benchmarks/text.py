"""Delimited text to edges, whole process, against reading the same file with pandas in chunks.

Runs alternate, so that a busy machine slows both; each ratio is of two neighbours, and the median
of the ratios is printed beside the target. Nothing is asserted. Both the time on the wall and the
time of the processor are compared; the second is the steadier one on a shared machine.

    python tests/benchmarks/text.py [ROWS [RUNS [FORM ...]]]

Forms: fixed (one width), signed (a sign and a second digit move the width), ragged (as many digits
as each number needs), exact (17 digits), exponents, commas (decimal commas, CRLF).
"""

from __future__ import annotations

import os
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np

ROWS, RUNS = 10_000_000, 3
CHUNK = 500_000
PERIOD_S, SHARE, DT_S = 2.0003e-3, 0.566, 1e-6  # invented: 2000.3 samples a period
FORMS = {
    "fixed": (b"%.12f,%.10f\n", 1.0, 9.0),
    "signed": (b"%.12f,%.9f\n", 0.0, 12.0),
    "ragged": (b"%.9g,%.12g\n", 0.0, 12.0),
    "exact": (b"%.17g,%.17g\n", 0.0, 12.0),
    "exponents": (b"%.8E,%+.8E\n", 0.0, 12.0),
    "commas": (b"%.9f;%.6f\r\n", 0.0, 12.0),
}
TARGETS = {"fixed": 3.0}
KEPT = {"PYTHONDONTWRITEBYTECODE": ""}  # bytecode is kept, as where both are installed
PANDAS = """
import sys, pandas
more = {"sep": ";", "decimal": ","} if sys.argv[2] == "commas" else {}
for _ in pandas.read_csv(sys.argv[1], chunksize=500_000, **more): pass
"""


@dataclass(frozen=True)
class Cost:
    """What a process took."""

    wall_s: float
    cpu_s: float
    peak_mb: float


def rows(form: str, n: int) -> Iterator[bytes]:
    """Yield the lines of a noisy square wave in pieces."""
    pattern, low_v, high_v = FORMS[form]
    rng = np.random.default_rng(1)
    for start in range(0, n, CHUNK):
        times_s = np.arange(start, min(start + CHUNK, n)) * DT_S
        is_high = times_s / PERIOD_S % 1.0 < SHARE
        volts = np.where(is_high, high_v, low_v) + rng.normal(0, 0.02, times_s.size)
        lines = b"".join(
            [pattern % pair for pair in zip(times_s.tolist(), volts.tolist(), strict=True)]
        )
        yield lines.replace(b".", b",") if form == "commas" else lines


def write(path: Path, form: str, n: int) -> None:
    """Write a file of one form."""
    mark = b";" if form == "commas" else b","
    with path.open("wb") as file:
        file.write(b"Time (s)" + mark + b"OUT (V)\n")
        file.writelines(rows(form, n))


def cost(command: list[str]) -> Cost:
    """Run a process to its end."""
    start_s = time.perf_counter()
    process = subprocess.Popen(command, stdout=subprocess.DEVNULL, env={**os.environ, **KEPT})
    _, status, used = os.wait4(process.pid, 0)
    wall_s = time.perf_counter() - start_s
    process.returncode = os.waitstatus_to_exitcode(status)
    if process.returncode:
        raise SystemExit(f"{command} ended with {process.returncode}")
    return Cost(wall_s, used.ru_utime + used.ru_stime, used.ru_maxrss / 1024)


def compare(path: Path, form: str, runs: int) -> None:
    """Print the ratios for one file."""
    ours = [sys.executable, "-m", "benchtool", "measure", str(path), "--json"]
    theirs = [sys.executable, "-c", PANDAS, str(path), form]
    cost(theirs), cost(ours)  # once before it counts
    pairs = [(cost(theirs), cost(ours)) for _ in range(runs)]
    wall = statistics.median(a.wall_s / b.wall_s for a, b in pairs)
    cpu = statistics.median(a.cpu_s / b.cpu_s for a, b in pairs)
    ours_s, theirs_s = (min(pair[k].wall_s for pair in pairs) for k in (1, 0))
    peak_mb = max(b.peak_mb for _, b in pairs)
    target = TARGETS.get(form, 1.0)
    print(
        f"{form:<10} {path.stat().st_size / 1e6:6.0f} MB  pandas {theirs_s:6.2f} s  "
        f"measure {ours_s:6.2f} s  ratio {wall:.2f} wall, {cpu:.2f} cpu  (target {target:.0f})  "
        f"peak {peak_mb:.0f} MB",
        flush=True,
    )


def main(n: int, runs: int, forms: list[str]) -> None:
    """Write each file, compare, remove it."""
    for form in forms:
        with tempfile.TemporaryDirectory() as folder:
            path = Path(folder) / f"{form}.csv"
            # apart, since the peak of a process counts what it was forked from
            subprocess.run([sys.executable, __file__, "write", path, form, str(n)], check=True)
            compare(path, form, runs)


if __name__ == "__main__":
    given = sys.argv[1:]
    if given[:1] == ["write"]:
        write(Path(given[1]), given[2], int(given[3]))
        raise SystemExit
    main(
        int(float(given[0])) if given else ROWS,
        int(given[1]) if len(given) > 1 else RUNS,
        given[2:] or list(FORMS),
    )
