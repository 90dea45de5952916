"""The search for edges against a plain loop over the samples, to the last bit.

The loop knows IEEE 181's definition only: a transition is complete when the wave goes from at or
beyond one outer reference level to at or beyond the other; its edge is the middle one of its
crossings of the mid level.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import pytest

from benchtool.model.arrays import AnyArray, FloatArray
from benchtool.model.capture import (
    ArraySamples,
    Samples,
    Scale,
    Span,
    StampedTime,
    UniformTime,
    Waveform,
)
from benchtool.model.timing import Levels
from benchtool.timing.crossings import Crossings, find_crossings
from benchtool.timing.rows import ROW
from benchtool.timing.thresholds import Thresholds, thresholds

BRIDGED = 3
LEVELS = Levels(
    kind="two-state",
    low_v=-40.0,
    high_v=40.0,
    u_low_v=0.1,
    u_high_v=0.1,
    noise_v=1.0,
    lower_v=-23.7,
    mid_v=1.3,
    upper_v=24.1,
)
LOGIC = Levels(
    kind="two-state",
    low_v=0.0,
    high_v=1.0,
    u_low_v=0.0,
    u_high_v=0.0,
    noise_v=0.0,
    lower_v=0.4,
    mid_v=0.5,
    upper_v=0.6,
)


@dataclass(frozen=True, slots=True)
class Blocks:
    """Samples that come in blocks of the lengths given, over and over."""

    array: AnyArray
    lengths: tuple[int, ...]

    @property
    def size(self) -> int:
        """Number of samples."""
        return int(self.array.size)

    @property
    def dtype(self) -> np.dtype[np.generic]:
        """Type of a sample."""
        return self.array.dtype

    def blocks(self, start: int = 0, stop: int | None = None) -> Iterator[AnyArray]:
        """Yield pieces of the lengths in turn."""
        end = self.size if stop is None else stop
        number = 0
        while start < end:
            length = self.lengths[number % len(self.lengths)]
            yield self.array[start : min(end, start + length)]
            start, number = start + length, number + 1


@dataclass(frozen=True, slots=True, kw_only=True)
class Plain:
    """A run as the loop sees it."""

    edges: list[tuple[int, bool, float, float]]
    starts_high: bool
    n_runts: int


def bridged(values: Sequence[float]) -> list[float]:
    """Fill holes of up to three samples inside a span by straight lines."""
    filled = list(values)
    at = 0
    while at < len(values):
        end = at
        while end < len(values) and not np.isfinite(values[end]):
            end += 1
        if at < end <= at + BRIDGED and at > 0 and end < len(values):
            filled[at:end] = np.interp(
                np.arange(at, end), [at - 1, end], [values[at - 1], values[end]]
            )
        at = end + 1
    return filled


def plain_runs(trace: Waveform, array: AnyArray, limits: Thresholds) -> list[Plain]:
    """Walk all samples one by one."""
    runs: list[Plain] = []
    for span in trace.spans:
        of_type = [float(x) for x in array[span.start : span.stop]]
        values = [float(array.dtype.type(x)) for x in bridged(of_type)]
        begin = 0
        for at in range(len(values) + 1):
            if at == len(values) or not np.isfinite(values[at]):
                if at > begin:
                    runs.append(plain_run(values[begin:at], span.start + begin, limits))
                begin = at + 1
    return runs


def plain_run(values: list[float], first: int, limits: Thresholds) -> Plain:
    """Find the transitions of one run."""
    crossings: list[int] = []  # since the last sample that rested
    edges: list[tuple[int, bool, float, float]] = []
    state: bool | None = None
    begins: bool | None = None
    n_runts = 0
    for at, value in enumerate(values):
        above = value >= limits.mid
        if at and above != (values[at - 1] >= limits.mid):
            crossings.append(at)
        if value >= limits.upper or value <= limits.lower:
            if state is None:
                begins = above
            elif state != above:
                middle = crossings[(len(crossings) - 1) // 2]
                edges.append(
                    (first + middle, above != limits.inverted, values[middle - 1], values[middle])
                )
            else:
                n_runts += len(crossings)
            state, crossings = above, []
    starts = begins if begins is not None else values[0] >= limits.mid
    return Plain(edges=edges, starts_high=starts != limits.inverted, n_runts=n_runts // 2)


def random_wave(rng: np.random.Generator, n: int, usual: float) -> FloatArray:
    """Return a wave with sharp and slow edges, noise, chatter around the middle, and runts."""
    wave = np.empty(n)
    at, level = 0, -40.0
    while at < n:
        length = int(rng.exponential(usual)) + 1
        wave[at : at + length] = level
        at += length
        slow = int(rng.choice([0, 0, 1, 3, 40]))
        target = float(rng.choice([-level, -level, -level, 5.0, 0.0]))
        ramp = np.linspace(level, target, slow + 2)[1:-1]
        wave[at : at + slow] = ramp[: max(0, n - at)]
        at += slow
        level = target if abs(target) > 20 else level
        if abs(target) <= 20 and at < n:  # about the middle for a while
            wave[at : at + 6] = rng.uniform(-3, 6, 6)[: max(0, n - at)]
            at += 6
    return wave + rng.normal(0, rng.choice([0.0, 1.0, 9.0]), n)


def make(
    rng: np.random.Generator, dtype: str, n: int, usual: float
) -> tuple[AnyArray, Levels, Scale]:
    wave = random_wave(rng, n, usual)
    if dtype == "bool":
        return wave > 0, LOGIC, Scale()
    if dtype.startswith("f"):
        values = wave.astype(dtype)
        for start in rng.integers(0, n, 1 + n // 700):
            values[start : start + int(rng.integers(1, 7))] = rng.choice([np.nan, np.inf, -np.inf])
        return values, LEVELS, Scale()
    gain = -1.0 if rng.random() < 0.5 else 1.0
    return np.clip(np.round(wave), -120, 120).astype(dtype), LEVELS, Scale(gain=gain)


def random_spans(rng: np.random.Generator, n: int) -> tuple[Span, ...]:
    cuts = [0, *sorted({int(x) for x in rng.integers(1, n, int(rng.integers(0, 3)))}), n]
    return tuple(
        Span(start=a, stop=b, start_s=a * 1e-6 + i) for i, (a, b) in enumerate(pairwise(cuts))
    )


def as_trace(samples: Samples, spans: tuple[Span, ...], scale: Scale) -> Waveform:
    return Waveform(
        samples=samples, time=UniformTime(dt_s=1e-6), spans=spans, channel="OUT", scale=scale
    )


def assert_same(found: tuple[Crossings, ...], plain: list[Plain]) -> None:
    assert len(found) == len(plain)
    for run, loop in zip(found, plain, strict=True):
        edges = zip(
            run.index.tolist(),
            run.rising.tolist(),
            run.before.tolist(),
            run.after.tolist(),
            strict=True,
        )
        assert list(edges) == loop.edges
        assert (run.starts_high, run.n_runts) == (loop.starts_high, loop.n_runts)


TYPES = ["int8", "int16", "float32", "float64", "bool"]


@pytest.mark.parametrize("dtype", TYPES)
@pytest.mark.parametrize("usual", [4.0, 60.0, 5000.0])
def test_a_plain_loop_finds_the_same_edges(dtype: str, usual: float) -> None:
    n_edges = 0
    for seed in range(4):
        rng = np.random.default_rng([seed, int(usual), TYPES.index(dtype)])
        n = int(rng.integers(2, 40)) if seed == 0 else int(rng.integers(1, 7) * ROW + seed - 3)
        array, levels, scale = make(rng, dtype, n, usual)
        trace = as_trace(ArraySamples(array), random_spans(rng, n), scale)
        limits = thresholds(trace, levels)
        found = find_crossings(trace, limits).runs
        assert_same(found, plain_runs(trace, array, limits))
        n_edges += sum(run.index.size for run in found)
    assert n_edges > 0


@pytest.mark.parametrize("dtype", TYPES)
@pytest.mark.parametrize("lengths", [(1,), (7, 1, 2), (ROW,), (ROW + 1, ROW - 1), (3 * ROW,)])
def test_edges_are_the_same_to_the_bit_in_whatever_blocks_they_come(
    dtype: str, lengths: tuple[int, ...], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("benchtool.timing.pieces.LEAST", 1)
    for usual in (5.0, 3000.0):
        rng = np.random.default_rng([len(lengths), lengths[0], TYPES.index(dtype)])
        n = 1500 if lengths[0] < 9 else 4 * ROW + 77
        array, levels, scale = make(rng, dtype, n, usual)
        trace = as_trace(Blocks(array, lengths), random_spans(rng, n), scale)
        limits = thresholds(trace, levels)
        assert_same(find_crossings(trace, limits).runs, plain_runs(trace, array, limits))


@pytest.mark.parametrize("share", [0.0, 0.5, 1.0])
def test_looking_into_few_rows_and_into_all_gives_the_same(
    share: float, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("benchtool.timing.changes._MOST_ROWS", share)
    for seed, dtype in enumerate(TYPES):
        for usual in (20.0, 900.0, 6000.0):
            rng = np.random.default_rng([seed, int(usual)])
            n = 5 * ROW + 19
            array, levels, scale = make(rng, dtype, n, usual)
            trace = as_trace(ArraySamples(array), random_spans(rng, n), scale)
            limits = thresholds(trace, levels)
            assert_same(find_crossings(trace, limits).runs, plain_runs(trace, array, limits))


@pytest.mark.parametrize("dtype", ["int16", "float32"])
def test_a_state_may_rest_in_a_row_far_from_its_edges_alone(dtype: str) -> None:
    values = np.full(40 * ROW, -10, dtype)
    changes = [int(x * ROW) for x in (5.5, 5.6, 5.7, 15.3, 22.0, 30.1)]
    for number, at in enumerate(changes):
        values[at:] = 10 if number % 2 == 0 else -10
    for at, rest in ((2.2, -30), (8.5, 30), (18.1, -30), (25.9, 30), (33.3, -30)):
        values[int(at * ROW)] = rest
    trace = as_trace(ArraySamples(values), (Span(start=0, stop=values.size, start_s=0.0),), Scale())
    limits = thresholds(trace, LEVELS)
    found = find_crossings(trace, limits).runs
    assert_same(found, plain_runs(trace, values, limits))
    assert found[0].index.tolist() == [changes[1], *changes[3:]]


def test_stamped_times_go_with_their_samples(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("benchtool.timing.pieces.LEAST", 1)
    rng = np.random.default_rng(9)
    array, levels, scale = make(rng, "float32", 5000, 30.0)
    stamps = np.cumsum(rng.uniform(0.1, 2.0, array.size))
    trace = Waveform(
        samples=Blocks(array, (1, 300, 2)),
        time=StampedTime(stamps=Blocks(stamps, (17, 400))),
        spans=(Span(start=0, stop=array.size, start_s=0.0),),
        channel="OUT",
        scale=scale,
    )
    runs = find_crossings(trace, thresholds(trace, levels)).runs
    assert sum(run.index.size for run in runs) > 50
    for run in runs:
        assert run.after_s.tolist() == stamps[run.index].tolist()
        assert run.before_s.tolist() == stamps[run.index - 1].tolist()


def test_a_float_sample_beside_the_level_is_on_the_side_that_the_exact_level_says() -> None:
    """In float32, 1.3 rounds up: a sample of that value is above the level of 1.3 all the same."""
    values = np.full(40, -30, np.float32)
    values[10:20] = np.float32(1.3)
    values[20:] = 30
    trace = as_trace(ArraySamples(values), (Span(start=0, stop=40, start_s=0.0),), Scale())
    for mid_v, first in ((float(np.float32(1.3)), 10), (float(np.float32(1.3)) + 1e-12, 20)):
        levels = Levels(
            kind="two-state",
            low_v=-30.0,
            high_v=30.0,
            u_low_v=0.1,
            u_high_v=0.1,
            noise_v=1.0,
            lower_v=-20.0,
            mid_v=mid_v,
            upper_v=20.0,
        )
        (run,) = find_crossings(trace, thresholds(trace, levels)).runs
        assert run.index.tolist() == [first]
