from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from timing_waves import Board, as_waveform, edge_times, transitions, trapezoid

from benchtool.model.capture import ArraySamples, StampedTime
from benchtool.timing import find_edges, find_intervals, make_overview


def test_a_long_record_is_drawn_by_its_first_cycles() -> None:
    rng = np.random.default_rng(1)
    board = Board(period_s=24.3e-3, duty=0.6, wander=1e-3)
    times = np.arange(1_200_000) * 2e-5
    wave = 5 * trapezoid(times, edge_times(board, 990, rng) + 1e-3, 1e-6)
    wave[300] = 7.5
    trace = as_waveform(wave, 2e-5)
    edges = find_edges(trace)
    view = make_overview(trace, edges, find_intervals(edges))
    assert view.envelope_s.size <= 2000
    assert view.envelope_s[-1] == pytest.approx(1e-3 + 4.3 * board.period_s, rel=0.02)
    assert (view.envelope_low_v.min(), view.envelope_high_v.max()) == (0.0, 7.5)
    assert view.edges_s.size == 9
    assert view.histogram_count.sum() == find_intervals(edges).period_s.size
    assert view.periods_s.size == 500


def test_a_logic_trace_is_drawn_by_its_corners() -> None:
    board = Board(period_s=1e-3, duty=0.5)
    edges = edge_times(board, 10, np.random.default_rng(1))
    trace = transitions(edges, 0.2e-3, 9.8e-3, 1e-6)
    found = find_edges(trace)
    view = make_overview(trace, found, find_intervals(found))
    assert set(view.envelope_low_v) == {0.0, 1.0}
    assert view.envelope_low_v[0] == 1.0
    assert np.all(np.diff(view.envelope_s) >= 0)


def test_a_flat_trace_is_drawn_whole() -> None:
    trace = as_waveform(np.full(100, 5.0), 1e-3)
    edges = find_edges(trace)
    view = make_overview(trace, edges, find_intervals(edges))
    assert view.envelope_s[-1] == pytest.approx(0.099)
    assert view.periods_s.size == view.histogram_count.size == 0


@pytest.mark.parametrize("stamped", [False, True])
def test_bins_that_blocks_share_hold_all_of_their_samples(stamped: bool) -> None:
    n = 2_345_678  # bins of 1173 samples, which divide no block
    values = np.resize(np.random.default_rng(2).normal(5, 0.02, 70_001), n).astype(np.float32)
    values[[400_000, 1_500_000]] = 5.4, 4.6
    values[30_000:33_000] = np.nan
    trace = as_waveform(values, 1e-6)
    if stamped:
        stamps = ArraySamples(np.arange(n) * 1e-6)
        trace = replace(trace, time=StampedTime(stamps=stamps))
    edges = find_edges(trace)
    view = make_overview(trace, edges, find_intervals(edges))
    size = -(-n // 2000)
    bins = [values[first : first + size] for first in range(0, n, size)]
    kept = [k for k, part in enumerate(bins) if np.isfinite(part).any()]
    assert view.envelope_low_v.tolist() == [np.nanmin(bins[k]) for k in kept]
    assert view.envelope_high_v.tolist() == [np.nanmax(bins[k]) for k in kept]
    np.testing.assert_allclose(view.envelope_s, np.array(kept) * size * 1e-6, rtol=1e-12)
