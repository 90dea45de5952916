"""How near the period comes to the best that can be done, as rms error over its bound.

    python tests/benchmarks/best_estimate.py [captures a figure] [processes]

Noise of the samples: from n rising and n falling straight edges of known shape in white noise
sigma_v, no unbiased estimate is better than

    sigma_t = sigma_v/sqrt(sum s'(t_i)^2),  sigma_T = sigma_t*sqrt(12/(n(n^2 - 1)))/sqrt(2)

(Cramér–Rao: the samples of an edge, then a line through edges of two free offsets). Noise of the
oscillator: the optimum is s/sqrt(N). Ticks of logic captures are left out. Each capture draws its
period over one sampling interval, its duty and phase.
"""

from __future__ import annotations

import math
import sys
from multiprocessing import Pool
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parent.parent / "timing"))
import timing_waves as waves

from benchtool.timing import find_edges, find_intervals, measure_timing

DT_S = 1e-5
COUNTS = (10, 100, 1000)
WAVES = (  # samples a period, full rise in samples, bits, noise of a sample in volts
    (20, 2.0, 8, 0.02),
    (20, 3.0, 8, 0.02),
    (40, 5.0, 8, 0.05),
    (40, 10.0, 12, 0.02),
    (100, 30.0, 8, 0.02),
)


def white_noise_ratio(
    n: int, rate: int, rise: float, bits: int, noise_v: float, captures: int
) -> float:
    """Return the rms error of the period over its bound."""
    rng = np.random.default_rng([n, rate, int(10 * rise), bits])
    errors = np.empty(captures)
    for i in range(captures):
        board = waves.Board(
            period_s=(rate + rng.uniform(0, 1)) * DT_S, duty=rng.uniform(0.45, 0.55)
        )
        edges = waves.edge_times(board, n, rng)[: 2 * n] + rng.uniform(0.3, 0.4) * board.period_s
        times_s = np.arange(0, edges[-1] + 0.3 * board.period_s, DT_S)
        wave = waves.trapezoid(times_s, edges, rise * DT_S)
        trace = waves.digitise(wave, DT_S, bits=bits, noise_v=noise_v, rng=rng)
        errors[i] = period_of(trace) - board.period_s
    slew = (waves.HIGH_V - waves.LOW_V) / (rise * DT_S)
    sigma_v = math.hypot(noise_v, waves.FULL_SCALE_V / 2**bits / math.sqrt(12))
    u_edge_s = sigma_v / (slew * math.sqrt(rise))
    bound_s = u_edge_s * math.sqrt(12 / (n * (n * n - 1))) / math.sqrt(2)
    return float(np.sqrt(np.mean(errors**2))) / bound_s


def oscillator_ratio(n: int, captures: int) -> float:
    """Return the rms error of the period of n wandering periods over s/sqrt(n)."""
    rng = np.random.default_rng([n, 7])
    errors, wander = np.empty(captures), 2e-3
    for i in range(captures):
        board = waves.Board(
            period_s=(40 + rng.uniform(0, 1)) * DT_S, duty=rng.uniform(0.4, 0.6), wander=wander
        )
        edges = waves.edge_times(board, n + 2, rng)
        start_s, end_s = waves.cut_record(edges, n, 3 * DT_S, rng)
        wave = waves.trapezoid(np.arange(start_s, end_s, DT_S), edges, 3 * DT_S)
        trace = waves.digitise(wave, DT_S, bits=12, noise_v=0.005, rng=rng)
        errors[i] = period_of(trace) / board.period_s - 1
    return float(np.sqrt(np.mean(errors**2))) / (wander / math.sqrt(n))


def period_of(trace: waves.Waveform) -> float:
    """Return the measured period in seconds."""
    edges = find_edges(trace)
    period = measure_timing(find_intervals(edges), edges).period
    return period.value  # type: ignore[union-attr]


def ratio(figure: tuple[tuple[int, float, int, float] | None, int, int]) -> float:
    """Return one figure of the table: a wave (None: the oscillator), n, and captures."""
    wave, n, captures = figure
    return white_noise_ratio(n, *wave, captures) if wave else oscillator_ratio(n, captures)


def main() -> None:
    """Print the ratios."""
    captures = int(sys.argv[1]) if len(sys.argv) > 1 else 2000
    processes = int(sys.argv[2]) if len(sys.argv) > 2 else 2
    print(f"{captures} captures a figure: rms error of the period over the least possible")
    print(f"{'':44}" + "".join(f"{f'n = {n}':>10}" for n in COUNTS))
    with Pool(processes) as pool:
        for wave in (*WAVES, None):
            name = "wandering oscillator"
            if wave:
                name = "{} samples, rise of {:g}, {} bits, {:g} V".format(*wave)
            ratios = pool.map(ratio, [(wave, n, captures) for n in reversed(COUNTS)], 1)
            print(f"{name:44}" + "".join(f"{x:10.3f}" for x in reversed(ratios)), flush=True)


if __name__ == "__main__":
    main()
