from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import pytest
from timing_waves import as_waveform, digitise, exponential, sampled_logic, trapezoid

from benchtool.model.arrays import AnyArray
from benchtool.model.capture import (
    ArraySamples,
    LogicTrace,
    Scale,
    Span,
    StampedTime,
    TimeSpan,
    UniformTime,
    Waveform,
)
from benchtool.timing import find_edges

DT_S = 1e-5
HIGH_S, LOW_S = 4.123e-4, 7.317e-4
EDGES = np.cumsum(np.tile([LOW_S, HIGH_S], 30)) + 3.307e-4
TIMES = np.arange(3270) * DT_S  # ends inside a low state


@dataclass(frozen=True, slots=True)
class ShortBlocks:
    """Samples that come in pieces of an odd length."""

    array: AnyArray
    length: int

    @property
    def size(self) -> int:
        """Number of samples."""
        return int(self.array.size)

    @property
    def dtype(self) -> np.dtype[np.generic]:
        """Type of a sample."""
        return self.array.dtype

    def blocks(self, start: int = 0, stop: int | None = None) -> Iterator[AnyArray]:
        """Yield pieces of the chosen length."""
        end = self.size if stop is None else stop
        for first in range(start, end, self.length):
            yield self.array[first : min(end, first + self.length)]


def seen(edges: np.ndarray) -> np.ndarray:
    return edges[edges < TIMES[-1]]


def test_interpolation_is_exact_on_straight_edges() -> None:
    edges = find_edges(as_waveform(5 * trapezoid(TIMES, EDGES, 2.5e-5), DT_S))
    assert edges.resolved
    # arithmetic: volts and times carry 1e-16 relative, an edge is 2.5e-5 s long
    np.testing.assert_allclose(edges.times_s, seen(EDGES), atol=1e-13)
    assert edges.rising.tolist() == [i % 2 == 0 for i in range(edges.rising.size)]


def test_edges_that_no_sample_lies_on_fall_half_way() -> None:
    edges = find_edges(as_waveform(5 * trapezoid(TIMES, EDGES, 1e-9), DT_S))
    assert not edges.resolved
    assert edges.step_s == DT_S
    assert np.all(np.abs(edges.times_s - seen(EDGES)) <= DT_S / 2)
    # half-way times are spread evenly: their errors have no mean (sd of it 0.4e-6)
    assert abs(np.mean(edges.times_s - seen(EDGES))) < 1.5e-6


@pytest.mark.parametrize("rise_s", [3e-5, 2e-4])
def test_edge_uncertainty_is_the_scatter_of_the_edges(rise_s: float) -> None:
    errors, u_s = [], []
    for seed in range(40):
        rng = np.random.default_rng(seed)
        wave = trapezoid(TIMES, EDGES, rise_s)
        edges = find_edges(digitise(wave, DT_S, bits=12, noise_v=0.05, rng=rng))
        errors.append(edges.times_s - seen(EDGES))
        u_s.append(edges.u_s)
    rms_s, stated_s = np.std(errors), np.sqrt(np.mean(np.square(u_s)))
    # 2200 edges fix the rms to 1.5 %; slope and window are estimates good to about a tenth
    assert stated_s == pytest.approx(rms_s, rel=0.15)


def test_a_fit_halves_the_noise_of_slow_edges() -> None:
    """Two neighbouring samples give 0.05 V over 22 kV/s, that is 2.3 µs, at best 0.7 of it."""
    rng = np.random.default_rng(1)
    wave = trapezoid(TIMES, EDGES, 2e-4)
    edges = find_edges(digitise(wave, DT_S, bits=12, noise_v=0.05, rng=rng))
    assert np.std(edges.times_s - seen(EDGES)) < 0.5 * 2.3e-6


def test_noise_that_crosses_the_level_many_times_is_one_edge() -> None:
    errors = []
    for seed in range(10):
        rng = np.random.default_rng(seed)
        wave = trapezoid(TIMES, EDGES, 1.5e-4)
        edges = find_edges(digitise(wave, DT_S, bits=12, noise_v=0.3, rng=rng))
        assert edges.times_s.size == seen(EDGES).size
        errors.append(edges.times_s - seen(EDGES))
    # unbiased: the mean over 550 edges is off by less than three of its standard errors
    assert abs(np.mean(errors)) < 3 * np.std(errors) / np.sqrt(np.size(errors))


def test_curved_edges_keep_their_widths() -> None:
    rng = np.random.default_rng(2)
    wave = exponential(TIMES, EDGES, 6e-5)
    edges = find_edges(digitise(wave, DT_S, bits=12, noise_v=0.01, rng=rng))
    widths = np.diff(edges.times_s)[::2]
    off_s = float(np.mean(widths)) - HIGH_S
    scatter_s = float(np.std(widths)) / np.sqrt(widths.size)
    # the states settle to 0.1 % only, which the stated level error has to cover
    assert abs(off_s) < 2 * np.hypot(edges.level_u_s, scatter_s)
    assert edges.level_u_s < 1e-6


def test_curvature_does_not_move_an_edge() -> None:
    """A straight line through the middle of an exponential would be 0.065 tau late."""
    rng = np.random.default_rng(5)
    tau_s = 6e-5
    wave = exponential(TIMES, EDGES, tau_s)
    edges = find_edges(digitise(wave, DT_S, bits=12, noise_v=0.01, rng=rng))
    late_s = (edges.times_s - seen(EDGES) - tau_s * np.log(2))[edges.rising]
    assert abs(np.mean(late_s)) < 0.02 * tau_s


@pytest.mark.parametrize("length", [1, 7, 64, 1000])
@pytest.mark.parametrize("kind", ["codes", "volts"])
def test_edges_do_not_depend_on_the_blocks(
    length: int, kind: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("benchtool.timing.pieces.LEAST", 1)
    rng = np.random.default_rng(3)
    whole = digitise(trapezoid(TIMES, EDGES, 3e-5), DT_S, bits=8, noise_v=0.1, rng=rng)
    array = whole.samples.array  # type: ignore[attr-defined]
    if kind == "volts":
        array = array.astype(np.float64)
        array[500:502] = np.nan
        array[900:950] = np.nan
        whole = as_waveform(array, DT_S, scale=whole.scale)
    cut = Waveform(
        samples=ShortBlocks(array, length),
        scale=whole.scale,
        time=whole.time,
        spans=whole.spans,
        channel="OUT",
    )
    one, many = find_edges(whole), find_edges(cut)
    np.testing.assert_allclose(many.times_s, one.times_s, rtol=1e-12)
    assert many.runs == one.runs


def test_codes_of_a_negative_gain_rise_where_the_volts_rise() -> None:
    codes = np.round(200 - 200 * trapezoid(TIMES, EDGES, 1e-9)).astype(np.uint8)
    edges = find_edges(as_waveform(codes, DT_S, scale=Scale(gain=-0.025, offset=5.0)))
    assert edges.rising[0]
    assert not edges.runs[0].starts_high


def test_short_holes_are_bridged_and_long_ones_split_the_record() -> None:
    volts = 5 * trapezoid(TIMES, EDGES, 1e-9)
    volts[60:63] = np.nan
    volts[1000:1004] = np.nan
    edges = find_edges(as_waveform(volts, DT_S))
    assert [run.start_s for run in edges.runs] == pytest.approx([0.0, 1004 * DT_S])
    assert edges.runs[0].end_s == pytest.approx(999 * DT_S)
    assert edges.runs[0].stop == edges.runs[1].first


def test_spans_are_runs_with_their_own_start() -> None:
    volts = 5 * trapezoid(TIMES, EDGES, 1e-9)
    trace = Waveform(
        samples=ArraySamples(volts),
        time=UniformTime(dt_s=DT_S),
        spans=(Span(start=0, stop=1000, start_s=0.0), Span(start=1000, stop=3270, start_s=2.0)),
        channel="OUT",
    )
    edges = find_edges(trace)
    assert len(edges.runs) == 2
    assert edges.times_s[edges.runs[1].first] == pytest.approx(
        2.0 + EDGES[EDGES > 1000 * DT_S][0] - 1000 * DT_S, abs=DT_S / 2
    )


def test_uneven_stamps_give_the_times() -> None:
    rng = np.random.default_rng(4)
    stamps = np.cumsum(rng.uniform(2e-6, 1.8e-5, 3300))
    trace = Waveform(
        samples=ArraySamples(5 * trapezoid(stamps, EDGES, 8e-5)),
        time=StampedTime(stamps=ArraySamples(stamps), resolution_s=1e-7),
        spans=(Span(start=0, stop=3300, start_s=0.0),),
        channel="OUT",
    )
    edges = find_edges(trace)
    np.testing.assert_allclose(edges.times_s, EDGES[: edges.times_s.size], atol=1e-11)
    # two stamps rounded to 0.1 µs over the record: q·√(2/12)/span
    assert edges.stretch_u_rel == pytest.approx(1e-7 * np.sqrt(1 / 6) / np.ptp(stamps))


def test_sampled_logic_counts_as_unresolved() -> None:
    edges = find_edges(sampled_logic(trapezoid(TIMES, EDGES, 1e-9), DT_S))
    assert not edges.resolved
    assert edges.times_s.size == seen(EDGES).size


def test_transitions_pass_through() -> None:
    trace = LogicTrace(
        times_s=np.array([1.0, 2.5, 4.0, 11.0]),
        states=np.array([True, False, True, False]),
        spans=(
            TimeSpan(start_s=0.0, end_s=5.0, starts_high=False),
            TimeSpan(start_s=10.0, end_s=12.0, starts_high=True),
        ),
        tick_s=0.5,
        channel="D0",
    )
    edges = find_edges(trace)
    assert edges.times_s is trace.times_s
    assert [(run.first, run.stop) for run in edges.runs] == [(0, 3), (3, 4)]
    assert (edges.step_s, edges.resolved) == (0.5, False)


def test_a_flat_trace_has_a_run_without_edges() -> None:
    edges = find_edges(as_waveform(np.full(100, 5.0), DT_S))
    assert edges.times_s.size == 0
    assert (edges.runs[0].starts_high, edges.runs[0].end_s) == (True, pytest.approx(99 * DT_S))


def test_a_runt_is_no_edge_and_is_counted() -> None:
    volts = 5 * trapezoid(TIMES, EDGES, 1e-9)
    at = int((EDGES[3] + 1e-4) / DT_S)
    volts[at : at + 4] = 3.1
    edges = find_edges(as_waveform(volts, DT_S))
    assert edges.times_s.size == seen(EDGES).size
    assert edges.n_runts == 1


def test_few_long_states_in_a_long_record_take_the_row_search() -> None:
    codes = np.zeros(1_000_000, np.int8)
    for start in (0, 2047, 2048, 300_000, 777_777):
        codes[start + 1 : start + 700] = 100
    edges = find_edges(as_waveform(codes, 1e-6))
    starts = [0, 2047, 300_000, 777_777]
    np.testing.assert_allclose(edges.times_s[::2], np.array(starts) * 1e-6 + 0.5e-6)
    np.testing.assert_allclose(
        edges.times_s[1::2], np.array([700, 2748, 300_700, 778_477]) * 1e-6 - 0.5e-6
    )
