"""Levels of long records: from a part of the samples and the range of all of them."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import pytest
from timing_waves import as_waveform

from benchtool.model.arrays import AnyArray
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
from benchtool.timing.sampling import N_RUNS, RUN, sample_runs

DT_S = 1e-6
LONG = 3_000_000


class Counting:
    """Samples that count how many of them are handed out."""

    def __init__(self, array: AnyArray) -> None:
        self.inner = ArraySamples(array)
        self.size, self.dtype = self.inner.size, self.inner.dtype
        self.n_given = 0

    def blocks(self, start: int = 0, stop: int | None = None) -> Iterator[AnyArray]:
        """Yield what was asked for, counted."""
        for block in self.inner.blocks(start, stop):
            self.n_given += block.size
            yield block


def square(period: int = 20_000) -> np.ndarray:
    """Return a long noisy square wave in codes."""
    rng = np.random.default_rng(1)
    wave = np.where(np.arange(LONG) % period < period // 3, 90.0, -90.0)
    return np.round(wave + np.resize(rng.normal(0, 2, 100_003), LONG)).astype(np.int8)


def shape_of(values: AnyArray, scale: Scale | None = None) -> tuple[object, Counting]:
    samples = Counting(values)
    trace = Waveform(
        samples=samples,
        time=UniformTime(dt_s=DT_S),
        spans=(Span(start=0, stop=samples.size, start_s=0.0),),
        channel="OUT",
        scale=scale or Scale(gain=0.02),
    )
    capture = Capture(origin=Origin(source="-", format="npz", sha256=""), traces=(trace,))
    return find_shapes(capture)[0], samples


def test_a_long_record_is_walked_once_for_levels_and_edges() -> None:
    shape, samples = shape_of(square())
    assert shape.edges.times_s.size == 2 * LONG // 20_000 - 1  # type: ignore[attr-defined]
    assert samples.n_given <= LONG + N_RUNS * (RUN + (1 << 16))  # runs are read over what is near


def test_levels_of_a_part_are_those_of_the_whole(monkeypatch: pytest.MonkeyPatch) -> None:
    trace = as_waveform(square(), DT_S, scale=Scale(gain=0.02))
    part = find_levels(trace)
    monkeypatch.setattr("benchtool.timing.survey.WHOLE", LONG)
    whole = find_levels(trace)
    assert part.kind == whole.kind
    assert abs(part.low_v - whole.low_v) < 3 * part.u_low_v
    assert abs(part.high_v - whole.high_v) < 3 * part.u_high_v
    # differences of a quarter of a million samples trimmed at 5 %: relative sd below 0.5 %
    assert part.noise_v == pytest.approx(whole.noise_v, rel=0.02)


def test_a_state_outside_the_sampled_part_is_found_with_its_edges() -> None:
    values = np.zeros(LONG, np.int8)
    values[1_234_567:1_234_580] = 100
    shape, samples = shape_of(values)
    assert shape.levels.high_v == pytest.approx(2.0)  # type: ignore[attr-defined]
    np.testing.assert_allclose(
        shape.edges.times_s,  # type: ignore[attr-defined]
        (np.array([1_234_567, 1_234_580]) - 0.5) * DT_S,
    )
    assert samples.n_given > 2 * LONG  # not by luck of the sampled part


def test_levels_and_edges_together_are_those_found_one_after_the_other() -> None:
    values = square().astype(np.float32)
    values[700_000:700_050] = np.nan
    shape, _ = shape_of(values)
    trace = shape.trace  # type: ignore[attr-defined]
    levels = find_levels(trace)
    edges = find_edges(trace, levels)
    assert shape.levels == levels  # type: ignore[attr-defined]
    assert [notice.code for notice in levels.warnings] == ["missing-samples"]
    assert "50 of 3000000" in levels.warnings[0].text
    assert shape.edges.times_s.tolist() == edges.times_s.tolist()  # type: ignore[attr-defined]
    assert shape.edges.runs == edges.runs  # type: ignore[attr-defined]


def test_runs_spread_over_many_short_spans_without_leaving_them() -> None:
    values = np.arange(LONG, dtype=np.float64)
    spans = tuple(
        Span(start=first, stop=first + 700, start_s=first * 1e-6)
        for first in range(100, LONG - 1000, 1000)
    )
    trace = Waveform(
        samples=ArraySamples(values), time=UniformTime(dt_s=DT_S), spans=spans, channel="OUT"
    )
    runs = sample_runs(trace)
    kept = np.concatenate(runs)
    assert kept.size == N_RUNS * RUN
    assert np.all((kept - 100) % 1000 < 700)
    assert all(np.all(np.diff(run) == 1) for run in runs)
    assert kept[0] < LONG / N_RUNS
    assert kept[-1] > LONG * (1 - 1 / N_RUNS)
