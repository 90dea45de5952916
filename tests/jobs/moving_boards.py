"""A simulated astable whose trimmer moves: records of an instrument, windows of a stream.

The misting controller (invented) a thousand times quicker: RA 100k, RB 330k, C 47 nF, so that an
ideal period is 24.76 ms. The trimmer is RB.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import replace

import numpy as np

from benchtool.circuits import Circuit, circuit_at, predict
from benchtool.designs import parse_design
from benchtool.errors import NotConnectedError
from benchtool.model.capture import Capture, LogicTrace, Origin, TimeSpan
from benchtool.model.design import Design
from benchtool.simulation import Acquisition, simulate

DESIGN = """\
schema = 1
[board]
name = "Mist valve timer, quick"
supply = "12 V 5%"
[stage.spacing]
topology = "astable"
channel = "OUT"
RA = "100k 1%"
RB = "330k 1%"
C = "47n 5%"
ic = "cmos"
[stage.spacing.limits]
period = { lower = "24 ms", upper = "25.5 ms", source = "drawing GH-MV-07 sheet 4" }
"""
RB_OHM = 330e3
START_NS = 1_900_000_000_000_000_000
LOST = NotConnectedError("the source has gone", hint="See whether it is still plugged in.")


def quick_design() -> Design:
    return parse_design(DESIGN, source="quick.toml")


def board(rb_ohm: float = RB_OHM) -> Circuit:
    return replace(circuit_at(quick_design().stages[0], quick_design()), RB=rb_ohm)


def period_s(rb_ohm: float = RB_OHM) -> float:
    """The true period of the simulated board."""
    period = predict(board(rb_ohm)).period
    assert period is not None
    return float(period)


def records(
    rbs_ohm: Iterable[float],
    *,
    periods: float = 8.5,
    rate_hz: float = 200e3,
    jitter_rel: float = 2e-4,
    seed: int = 1,
) -> Iterator[Capture]:
    """Yield a record of its own for each setting of the trimmer."""
    rng = np.random.default_rng(seed)
    taken = Acquisition(
        rate_hz=rate_hz, periods=periods, bits=8, noise_v=0.02, jitter_rel=jitter_rel
    )
    for rb_ohm in rbs_ohm:
        capture, _ = simulate(board(rb_ohm), taken, rng)
        yield capture


def edge_times(
    periods_s: Sequence[float], *, jitter_rel: float = 2e-4, duty: float = 0.566, seed: int = 1
) -> np.ndarray:
    """Return rising and falling edges in turn, from periods that each scatter."""
    rng = np.random.default_rng(seed)
    lengths = np.asarray(periods_s) * (1 + jitter_rel * rng.normal(size=len(periods_s)))
    widths = np.stack([lengths * duty, lengths * (1 - duty)], axis=1).ravel()
    return np.concatenate([[0.0], np.cumsum(widths)])


def windows(
    edges_s: np.ndarray, *, every_s: float, window_s: float, tick_s: float = 1e-6
) -> Iterator[Capture]:
    """Yield what a stream holds of its newest stretch, each time a little later; they overlap."""
    times_s = np.round(edges_s / tick_s) * tick_s
    for end_s in (*np.arange(every_s, edges_s[-1], every_s), times_s[-1]):
        start_s = max(0.0, end_s - window_s)
        inside = (times_s > start_s) & (times_s <= end_s)
        first = int(np.argmax(inside)) if inside.any() else int(np.sum(times_s <= start_s))
        rising = np.arange(times_s.size) % 2 == 0
        span = TimeSpan(start_s=0.0, end_s=end_s - start_s, starts_high=first % 2 == 1)
        trace = LogicTrace(
            times_s=times_s[inside] - start_s,
            states=rising[inside],
            spans=(span,),
            tick_s=tick_s,
            channel="OUT",
        )
        start_ns = START_NS + round(start_s * 1e9)
        origin = Origin(source="stream", format="edges", sha256="0" * 64, start_ns=start_ns)
        yield Capture(origin=origin, traces=(trace,))


class Played:
    """A stream that plays captures, and then has gone."""

    source = "played"

    def __init__(self, captures: Iterable[Capture]) -> None:
        self._captures = iter(captures)
        self.closed = False

    def newest(self, timeout_s: float) -> Capture | None:  # noqa: ARG002 - a stream's signature
        """Return the next."""
        try:
            return next(self._captures)
        except StopIteration:
            raise LOST from None

    def close(self) -> None:
        """Note the end."""
        self.closed = True


def steps(*settings: tuple[float, int]) -> list[float]:
    """Return settings of the trimmer, each so many times."""
    return [value for value, n in settings for _ in range(n)]


def relative(value: float, to: float) -> float:
    return abs(value / to - 1) if math.isfinite(value) else math.inf
