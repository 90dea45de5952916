"""What one update of ``benchtool watch`` costs, for captures of a million samples.

::

    python tests/benchmarks/watch.py

The source costs nothing here: the captures are in memory. Target: 10 updates a second on two cores,
drawing included.
"""

from __future__ import annotations

import os
import sys
import time
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
sys.path.insert(0, str(Path(__file__).parents[1] / "jobs"))

import numpy as np
from moving_boards import board, period_s, quick_design

from benchtool.jobs.watch_plan import plan_watch
from benchtool.jobs.watch_sight import View, look_at
from benchtool.jobs.watch_state import WatchState, advance, begin
from benchtool.model.capture import Capture
from benchtool.model.options import MeasureOptions
from benchtool.observation import settle
from benchtool.report.screen.watch import Frame, watch_rows
from benchtool.report.watching import watch_document
from benchtool.simulation import Acquisition, simulate

N_SAMPLES = 1_000_000
TARGET_HZ = 10.0
_EVERY_S = 0.1  # between two captures, so that levels are found anew each second


def captures(n_periods: float, *, resolved: bool, n: int = 4) -> list[Capture]:
    """Return records of a trimmer that is turned a little between each."""
    rate_hz = N_SAMPLES / (n_periods * period_s())
    taken = Acquisition(
        rate_hz=rate_hz,
        duration_s=N_SAMPLES / rate_hz,
        bits=8,
        noise_v=0.05,
        jitter_rel=2e-4,
        bandwidth_hz=0.05 * rate_hz if resolved else None,
    )
    rng = np.random.default_rng(1)
    return [simulate(board(330e3 + 50 * k), taken, rng)[0] for k in range(n)]


def updates(made: list[Capture], n: int) -> tuple[float, WatchState]:
    """Return the seconds that ``n`` updates take, and the state after them."""
    design = quick_design()
    settings = settle(MeasureOptions(), design)
    state = begin(plan_watch(settings, design))
    view = View(settings=settings, design=design, own_axis=True)
    begun_s = time.perf_counter()
    for i in range(n):
        sight, view = look_at(made[i % len(made)], view, i * _EVERY_S)
        state = advance(state, sight)
    return time.perf_counter() - begun_s, state


def each(work: Callable[[], object], n: int = 200) -> float:
    """Return the seconds that one call takes."""
    begun_s = time.perf_counter()
    for _ in range(n):
        work()
    return (time.perf_counter() - begun_s) / n


def main() -> None:
    """Print updates a second beside the target."""
    print(f"{'periods':>8} {'edges':>10} {'trimmer':>8} {'updates/s':>10}  target {TARGET_HZ:g}")
    for n_periods in (10.5, 1000.5):
        for resolved in (False, True):
            made = captures(n_periods, resolved=resolved)
            for turned in (True, False):
                shown = made if turned else made[:1]
                updates(shown, 3)
                took_s, state = updates(shown, 30)
                kind = "between" if resolved else "on a grid"
                words = "turned" if turned else "still"
                print(f"{n_periods:8g} {kind:>10} {words:>8} {30 / took_s:10.1f}")
    reading = replace(state.reading, points=state.reading.points * 8)
    for width, height in ((80, 24), (120, 40)):
        frame = Frame(width=width, height=height, keys="q quit")
        took_s = each(lambda frame=frame: watch_rows(reading, 1.0, frame))  # type: ignore[misc]
        print(f"drawing {width}x{height}: {1e3 * took_s:.2f} ms")
    took_s = each(lambda: watch_document(reading, 1.0, version="0", made_at=""))
    print(f"document: {1e3 * took_s:.2f} ms")


if __name__ == "__main__":
    main()
